//! An error with its causes, in one line.

/// The error and its causes, outermost first, separated by colons. A cause that an error repeats word for word (a
/// transparent one) is told once.
pub(crate) fn told(error: &dyn std::error::Error) -> String {
    let mut text = error.to_string();
    let mut cause = error.source();
    while let Some(inner) = cause {
        let words = inner.to_string();
        if !text.ends_with(&words) {
            text = format!("{text}: {words}");
        }
        cause = inner.source();
    }
    text
}
