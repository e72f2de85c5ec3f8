//! Source files, spans, lines and columns.
