//! Companions, missing bands, advice, screening.

pub mod companion;

pub mod splitting;

pub mod advice;
