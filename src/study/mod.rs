//! The TOML study, validated into library types.
