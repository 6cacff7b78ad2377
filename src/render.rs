//! One report record, one function a format.
