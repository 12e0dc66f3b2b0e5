//! What a terminal shows: how many columns, and signs that not every one has.

/// Width of everything that is printed, in columns, unless the terminal is narrower.
const WIDTH: u16 = 80;
/// Width below which a table is no table any more: what is narrower breaks the lines itself.
const LEAST_WIDTH: u16 = 40;

/// The signs and the width of a terminal.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) struct Screen {
    pub(super) degree: &'static str,
    pub(super) plus_minus: &'static str,
    pub(super) rule: char,
    /// Most columns of a line.
    pub(super) width: u16,
}

impl Screen {
    /// Signs beyond ASCII.
    pub(crate) const UNICODE: Self = Self { degree: "°", plus_minus: "±", rule: '─', width: WIDTH };
    /// ASCII alone.
    pub(crate) const ASCII: Self = Self { degree: " deg", plus_minus: "+/-", rule: '-', width: WIDTH };

    /// The same signs on a terminal of so many columns, where that is known.
    pub(crate) fn of_columns(self, columns: Option<u16>) -> Self {
        Self { width: columns.map_or(WIDTH, |columns| columns.clamp(LEAST_WIDTH, WIDTH)), ..self }
    }

    /// As wide as what is printed anywhere but on a terminal.
    pub(crate) fn of_file(self) -> Self {
        self.of_columns(None)
    }

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
    fn only_a_narrow_terminal_changes_the_width() {
        let width = |columns| Screen::ASCII.of_columns(columns).width;
        assert_eq!([None, Some(0), Some(64), Some(80), Some(200)].map(width), [80, 40, 64, 80, 80]);
        assert_eq!(Screen::ASCII.of_columns(Some(50)).of_file(), Screen::ASCII);
    }

    #[test]
    fn the_first_variable_that_says_anything_decides() {
        let of = |values: [&str; 3]| Screen::of(values.map(str::to_owned));
        assert_eq!(of(["", "", "en_GB.UTF-8"]), Screen::UNICODE);
        assert_eq!(of(["C.utf8", "C", "C"]), Screen::UNICODE);
        assert_eq!(of(["C", "", "en_GB.UTF-8"]), Screen::ASCII);
        assert_eq!(of(["", "", ""]), Screen::ASCII);
    }
}
