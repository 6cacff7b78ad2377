//! Bundled mode tables and default constants, compiled in from `mode_tables/`, each row with its source.
