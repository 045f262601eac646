//! The document an engineer enters, its check and its file.
