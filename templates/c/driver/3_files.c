/* ---- files: written under a temporary name, flushed, renamed ---- */

/* A path inside the run's folder; the caller frees it. */
static char *path_of(const char *folder, const char *name)
{
    struct text path = {NULL, 0, 0};
    add_format(&path, "%s/%s", folder, name);
    return path.bytes;
}

static int cannot_write(const char *path, int reason)
{
    say("cannot write '%s': %s%s", path, strerror(reason),
        reason == ENOSPC ? "; free some space, or choose another --out" : reason == EACCES || reason == EROFS ? "; choose another --out" : "");
    return ENVIRONMENT_FAILED;
}

struct file {
    FILE *stream;
    char *path, *temporary;
    uint64_t checksum; /* FNV-1a of all bytes so far (Fowler, Noll, Vo 1991; from memory) */
    int failure;       /* errno of the first failure */
};

#define EMPTY_CHECKSUM UINT64_C(0xcbf29ce484222325)

static uint64_t checksum_on(uint64_t checksum, const unsigned char *bytes, size_t count)
{
    size_t k;
    for (k = 0; k < count; k++) {
        checksum = (checksum ^ bytes[k]) * UINT64_C(0x100000001b3);
    }
    return checksum;
}

static struct file open_file(const char *folder, const char *name)
{
    struct file file = {NULL, NULL, NULL, EMPTY_CHECKSUM, 0};
    struct text temporary = {NULL, 0, 0};
    file.path = path_of(folder, name);
    add_format(&temporary, "%s.tmp", file.path);
    file.temporary = temporary.bytes;
    file.stream = fopen(file.temporary, "wb");
    if (file.stream == NULL) {
        file.failure = errno;
    }
    return file;
}

static void put_bytes(struct file *file, const void *bytes, size_t count)
{
    if (file->failure == 0 && count > 0 && fwrite(bytes, 1, count, file->stream) != count) {
        file->failure = errno != 0 ? errno : EIO;
    }
}

static void put_checked(struct file *file, const void *bytes, size_t count)
{
    file->checksum = checksum_on(file->checksum, bytes, count);
    put_bytes(file, bytes, count);
}

/* Little-endian, whatever the machine is. */
static void to_bytes(uint64_t word, unsigned char *bytes)
{
    int k;
    for (k = 0; k < 8; k++) {
        bytes[k] = (unsigned char)(word >> (8 * k));
    }
}

static uint64_t from_bytes(const unsigned char *bytes)
{
    uint64_t word = 0;
    int k;
    for (k = 7; k >= 0; k--) {
        word = (word << 8) | bytes[k];
    }
    return word;
}

/* values[k] / scale; a scale of one changes no bit. `checked` counts them into the checksum. */
static void put_doubles(struct file *file, const double *values, size_t count, double scale, void (*put)(struct file *, const void *, size_t))
{
    unsigned char block[8 * 512];
    size_t at = 0;
    while (at < count) {
        size_t here = count - at < 512 ? count - at : 512, k;
        for (k = 0; k < here; k++) {
            double value = values[at + k] / scale;
            uint64_t word;
            memcpy(&word, &value, sizeof word);
            to_bytes(word, block + 8 * k);
        }
        put(file, block, 8 * here);
        at += here;
    }
}

enum durability { FLUSHED, SYNCED };

/* Gives the file its name, or removes it. Returns an exit status. */
static int close_file(struct file *file, enum durability durability)
{
    int status = FINISHED;
    if (file->stream != NULL) {
        if (fflush(file->stream) != 0 && file->failure == 0) {
            file->failure = errno;
        }
        if (durability == SYNCED && file->failure == 0 && fsync(fileno(file->stream)) != 0) {
            file->failure = errno;
        }
        if (fclose(file->stream) != 0 && file->failure == 0) {
            file->failure = errno;
        }
    }
    if (file->failure == 0 && rename(file->temporary, file->path) != 0) {
        file->failure = errno;
    }
    if (file->failure != 0) {
        remove(file->temporary);
        status = cannot_write(file->path, file->failure);
    }
    free(file->path);
    free(file->temporary);
    return status;
}

static int write_text(const char *folder, const char *name, const char *bytes)
{
    struct file file = open_file(folder, name);
    put_bytes(&file, bytes, strlen(bytes));
    return close_file(&file, FLUSHED);
}

/* Makes the folder and the missing ones above it. */
static int make_folders(const char *path)
{
    struct text prefix = {NULL, 0, 0};
    const char *at = path;
    int failed = 0;
    do {
        const char *slash = strchr(at, '/');
        size_t length = slash == NULL ? strlen(path) : (size_t)(slash - path);
        prefix.length = 0;
        add_bytes(&prefix, path, length);
        if (length > 0 && mkdir(prefix.bytes, 0777) != 0 && errno != EEXIST && errno != EISDIR) {
            failed = errno;
        }
        at = slash == NULL ? NULL : slash + 1;
    } while (at != NULL && failed == 0);
    drop_text(&prefix);
    if (failed != 0) {
        say("cannot make the folder '%s': %s; choose another --out", path, strerror(failed));
        return ENVIRONMENT_FAILED;
    }
    return FINISHED;
}

static int file_exists(const char *folder, const char *name)
{
    char *path = path_of(folder, name);
    struct stat entry;
    int found = stat(path, &entry) == 0;
    free(path);
    return found;
}

enum occupancy { ABSENT, EMPTY, OCCUPIED, NO_FOLDER, UNREADABLE };

static enum occupancy look_into(const char *folder)
{
    struct stat entry;
    struct dirent *item;
    enum occupancy found = EMPTY;
    DIR *list;
    if (stat(folder, &entry) != 0) {
        return errno == ENOENT ? ABSENT : UNREADABLE;
    }
    if (!S_ISDIR(entry.st_mode)) {
        return NO_FOLDER;
    }
    list = opendir(folder);
    if (list == NULL) {
        return UNREADABLE;
    }
    while ((item = readdir(list)) != NULL) {
        if (strcmp(item->d_name, ".") != 0 && strcmp(item->d_name, "..") != 0) {
            found = OCCUPIED;
        }
    }
    closedir(list);
    return found;
}

/* Refuses a folder that results would overwrite. */
static int accept_folder(const char *folder, int resume)
{
    switch (look_into(folder)) {
    case NO_FOLDER:
        say("'%s' is a file, not a folder; choose another --out", folder);
        return BAD_ARGUMENTS;
    case UNREADABLE:
        say("cannot look into '%s': %s; choose another --out", folder, strerror(errno));
        return ENVIRONMENT_FAILED;
    case ABSENT:
    case EMPTY:
        if (resume) {
            say("there is no run in '%s' to go on with; start one without --resume", folder);
            return BAD_ARGUMENTS;
        }
        return make_folders(folder);
    case OCCUPIED:
        break;
    }
    if (resume) {
        if (file_exists(folder, "checkpoint.bin") || file_exists(folder, "checkpoint.old")) {
            return FINISHED;
        }
        say("'%s' holds no checkpoint%s; choose another --out for a new run", folder,
            file_exists(folder, "run.json") ? ": its run has ended" : "");
    } else if (file_exists(folder, "checkpoint.bin")) {
        say("'%s' holds an unfinished run; go on with it by --resume, or choose another --out", folder);
    } else if (file_exists(folder, "run.json")) {
        say("'%s' holds a run already; choose another --out, or remove that folder", folder);
    } else {
        say("'%s' holds something that is not a run; choose another --out", folder);
    }
    return BAD_ARGUMENTS;
}

