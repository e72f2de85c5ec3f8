//! Files: written under a temporary name, flushed, renamed, so that no half file is ever left under a final name.

use super::Failure;
use std::fs::File;
use std::io::{self, BufWriter, ErrorKind, Write};
use std::path::{Path, PathBuf};

/// Checksum of nothing (FNV-1a, 64 bits: Fowler, Noll, Vo 1991; from memory).
pub const EMPTY_CHECKSUM: u64 = 0xcbf2_9ce4_8422_2325;

/// The checksum after more bytes.
pub fn checksum_on(checksum: u64, bytes: &[u8]) -> u64 {
    bytes.iter().fold(checksum, |sum, byte| (sum ^ u64::from(*byte)).wrapping_mul(0x100_0000_01b3))
}

/// What to tell when a file cannot be written.
pub fn cannot_write(path: &Path, reason: &io::Error) -> Failure {
    let advice = match reason.kind() {
        ErrorKind::StorageFull => "; free some space, or choose another --out",
        ErrorKind::PermissionDenied | ErrorKind::ReadOnlyFilesystem => "; choose another --out",
        _ => "",
    };
    Failure::Environment(format!("cannot write '{}': {reason}{advice}", path.display()))
}

/// How sure it has to be that a file is on the disk before it gets its name.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Durability {
    Flushed,
    Synced,
}

/// A file that is being written; dropped before `close`, it leaves nothing behind, unless it is kept.
pub struct OutFile {
    stream: Option<BufWriter<File>>,
    path: PathBuf,
    temporary: PathBuf,
    kept: bool,
    /// Of all bytes put with `put_checked`.
    pub checksum: u64,
}

/// The name a file has until it is complete.
pub fn temporary_name(path: &Path) -> PathBuf {
    let mut name = path.as_os_str().to_owned();
    name.push(".tmp");
    PathBuf::from(name)
}

impl OutFile {
    /// A new file that will be `path`.
    pub fn create(path: PathBuf) -> Result<OutFile, Failure> {
        let temporary = temporary_name(&path);
        let file = File::create(&temporary).map_err(|reason| cannot_write(&path, &reason))?;
        Ok(OutFile::wrap(file, path, EMPTY_CHECKSUM))
    }

    /// Goes on at the present place of an open temporary file.
    pub fn wrap(file: File, path: PathBuf, checksum: u64) -> OutFile {
        let temporary = temporary_name(&path);
        OutFile {
            stream: Some(BufWriter::with_capacity(1 << 16, file)),
            path,
            temporary,
            kept: false,
            checksum,
        }
    }

    fn attempt<T>(&mut self, act: impl FnOnce(&mut BufWriter<File>) -> io::Result<T>) -> Result<T, Failure> {
        let stream = self.stream.as_mut().ok_or_else(|| io::Error::other("the file is closed"));
        stream.and_then(act).map_err(|reason| cannot_write(&self.path, &reason))
    }

    pub fn put(&mut self, bytes: &[u8]) -> Result<(), Failure> {
        self.attempt(|stream| stream.write_all(bytes))
    }

    /// Counts the bytes into the checksum.
    pub fn put_checked(&mut self, bytes: &[u8]) -> Result<(), Failure> {
        self.checksum = checksum_on(self.checksum, bytes);
        self.put(bytes)
    }

    /// `values / scale`, little-endian; a scale of one changes no bit.
    pub fn put_doubles(&mut self, values: &[f64], scale: f64) -> Result<(), Failure> {
        self.doubles(values, scale, OutFile::put)
    }

    pub fn put_doubles_checked(&mut self, values: &[f64]) -> Result<(), Failure> {
        self.doubles(values, 1.0, OutFile::put_checked)
    }

    fn doubles(
        &mut self,
        values: &[f64],
        scale: f64,
        put: fn(&mut OutFile, &[u8]) -> Result<(), Failure>,
    ) -> Result<(), Failure> {
        let mut block = [0u8; 8 * 512];
        for part in values.chunks(512) {
            for (bytes, value) in block.chunks_exact_mut(8).zip(part) {
                bytes.copy_from_slice(&(value / scale).to_le_bytes());
            }
            put(self, &block[..8 * part.len()])?;
        }
        Ok(())
    }

    /// From here on a checkpoint refers to what is there: it stays, under the temporary name, whatever happens.
    pub fn keep(&mut self) {
        self.kept = true;
    }

    /// Everything so far to the disk, the file stays open.
    pub fn sync(&mut self) -> Result<(), Failure> {
        self.attempt(|stream| {
            stream.flush()?;
            stream.get_ref().sync_all()
        })
    }

    /// Gives the file its name.
    pub fn close(mut self, durability: Durability) -> Result<(), Failure> {
        match durability {
            Durability::Flushed => self.attempt(Write::flush)?,
            Durability::Synced => self.sync()?,
        }
        let renamed = std::fs::rename(&self.temporary, &self.path);
        renamed.map_err(|reason| cannot_write(&self.path, &reason))?;
        self.stream = None;
        Ok(())
    }
}

impl Drop for OutFile {
    fn drop(&mut self) {
        if let Some(stream) = self.stream.take().filter(|_| !self.kept) {
            // What was buffered is of no use in a file that goes away.
            drop(stream.into_parts());
            let _ = std::fs::remove_file(&self.temporary);
        }
    }
}

/// A whole text file.
pub fn write_text(path: PathBuf, text: &str) -> Result<(), Failure> {
    let mut file = OutFile::create(path)?;
    file.put(text.as_bytes())?;
    file.close(Durability::Flushed)
}
