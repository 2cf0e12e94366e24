//! The command line: arguments, options, one function a command, exit codes.
