//! (interface follows)
