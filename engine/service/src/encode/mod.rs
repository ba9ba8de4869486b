//! Domain to message.
