//! Signs that not every terminal has, and what stands for them.

/// The signs of a terminal.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) struct Glyphs {
    pub(super) degree: &'static str,
    pub(super) plus_minus: &'static str,
    pub(super) rule: char,
}

impl Glyphs {
    /// Signs beyond ASCII.
    pub(crate) const UNICODE: Self = Self { degree: "°", plus_minus: "±", rule: '─' };
    /// ASCII alone.
    pub(crate) const ASCII: Self = Self { degree: " deg", plus_minus: "+/-", rule: '-' };

    /// What the locale of the process shows: the first of `LC_ALL`, `LC_CTYPE` and `LANG` that says anything decides.
    pub(crate) fn of_locale() -> Self {
        Self::of(
            ["LC_ALL", "LC_CTYPE", "LANG"]
                .into_iter()
                .map(std::env::var_os)
                .map(|value| value.map_or_else(String::new, |value| value.to_string_lossy().into_owned())),
        )
    }

    fn of(values: impl IntoIterator<Item = String>) -> Self {
        let locale =
            values.into_iter().find(|value| !value.is_empty()).unwrap_or_default().to_ascii_lowercase();
        if locale.contains("utf-8") || locale.contains("utf8") { Self::UNICODE } else { Self::ASCII }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_first_variable_that_says_anything_decides() {
        let of = |values: [&str; 3]| Glyphs::of(values.map(str::to_owned));
        assert_eq!(of(["", "", "en_GB.UTF-8"]), Glyphs::UNICODE);
        assert_eq!(of(["C.utf8", "C", "C"]), Glyphs::UNICODE);
        assert_eq!(of(["C", "", "en_GB.UTF-8"]), Glyphs::ASCII);
        assert_eq!(of(["", "", ""]), Glyphs::ASCII);
    }
}
