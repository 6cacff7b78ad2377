//! Which levels fall in a window, each once, the same for any number of threads.
