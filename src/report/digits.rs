//! Digits cut to the bar, engineering units, columns aligned on the point.

/// Significant digits of a number whose bar is zero [1]: it was given, and is shown as typed or, times
/// a square root of two, with more digits than anybody sets a voltage to.
const ZERO_BAR_DIGITS: usize = 7;

/// Most significant digits of any number [1]: a double holds 15 for certain.
const MOST_DIGITS: i32 = 15;

/// Powers of ten between which a number is written without exponent [1].
const PLAIN: std::ops::RangeInclusive<i32> = -4..=6;

/// A number and its bar as text, both to the same decimal place.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Shown {
    /// The number, or `< bar` if it is smaller than its bar.
    pub value: String,
    /// The bar, at most two digits, rounded up; `0` if there is none.
    pub bar: String,
}

/// A number with its digits cut to its bar.
///
/// The bar keeps two digits and is rounded up, never down; the number is rounded to the same place.
/// Numbers from a million on, and small ones below 1e-4, carry a power of ten.
pub fn with_bar(value: f64, bar: f64) -> Shown {
    if !value.is_finite() || !bar.is_finite() {
        let text = "not finite".to_owned();
        return Shown { value: text.clone(), bar: text };
    }
    let bar = bar.abs();
    if bar == 0.0 {
        return Shown { value: significant(value, ZERO_BAR_DIGITS), bar: "0".to_owned() };
    }
    let top = exponent(value.abs().max(bar));
    let shift = if PLAIN.contains(&top) { 0 } else { top };
    let (value, bar) = (shifted(value, shift), shifted(bar, shift));
    let mut places = 1 - exponent(bar);
    if 100.0 <= rounded_up(bar, places) {
        places -= 1;
    }
    let places = places.min(MOST_DIGITS - 1 - exponent(value.abs().max(bar)));
    let suffix = if shift == 0 { String::new() } else { format!("e{shift}") };
    let bar_text = format!("{}{suffix}", fixed(shifted(rounded_up(bar, places), places), places));
    let value_text =
        if value.abs() < bar { format!("< {bar_text}") } else { format!("{}{suffix}", fixed(value, places)) };
    Shown { value: value_text, bar: bar_text }
}

/// A number with its bar in one text: `6.4155 ± 0.0021`, or `< 0.0021`; no bar: the number alone.
pub fn cell(value: f64, bar: f64) -> String {
    let shown = with_bar(value, bar);
    if shown.value.starts_with('<') || shown.bar == "0" {
        return shown.value;
    }
    format!("{} ± {}", shown.value, shown.bar)
}

/// A quantity with its bar in the prefix that suits it: `31.160 ± 0.012 kV`.
pub fn engineering(value: f64, bar: f64, unit: &str) -> String {
    let (factor, prefix) = prefix(value.abs().max(bar.abs()));
    format!("{} {prefix}{unit}", cell(value / factor, bar / factor))
}

/// A number with `digits` significant digits, trailing zeros of the fraction dropped.
pub fn significant(value: f64, digits: usize) -> String {
    if !value.is_finite() {
        return "not finite".to_owned();
    }
    if value == 0.0 {
        return "0".to_owned();
    }
    let rounded: f64 = format!("{value:.*e}", digits.max(1) - 1).parse().unwrap_or(value);
    let top = exponent(rounded.abs());
    let shift = if PLAIN.contains(&top) { 0 } else { top };
    let places = (digits as i32 - 1 - top + shift).max(0);
    let text = fixed(shifted(rounded, shift), places);
    let text = if text.contains('.') { text.trim_end_matches('0').trim_end_matches('.') } else { &text };
    if shift == 0 { text.to_owned() } else { format!("{text}e{shift}") }
}

/// A share as a percentage with three significant digits and, if asked, its sign: `+11.6 %`.
pub fn percent(share: f64, signed: bool) -> String {
    // Below the rounding of a double a share has no digit that means anything.
    let share = if share.abs() < f64::EPSILON { 0.0 } else { share };
    let text = significant(100.0 * share, 3);
    let sign = if signed && 0.0 < share && share.is_finite() { "+" } else { "" };
    format!("{sign}{text} %")
}

/// A place in multiples of `unit` [m], all three numbers to the same decimal place: five digits of
/// the largest.
pub fn place(at: &[f64; 3], unit: f64) -> String {
    let at = at.map(|c| c / unit);
    let largest = at.iter().fold(0.0, |top: f64, c| top.max(c.abs()));
    if !largest.is_finite() || largest == 0.0 {
        return if largest == 0.0 { "(0, 0, 0)".to_owned() } else { "(not finite)".to_owned() };
    }
    let places = (4 - exponent(largest)).clamp(0, MOST_DIGITS);
    format!("({}, {}, {})", fixed(at[0], places), fixed(at[1], places), fixed(at[2], places))
}

/// The texts padded so that their decimal points (or the ends of their whole parts) stand below
/// each other and all have one width.
pub fn align(cells: &[String]) -> Vec<String> {
    let before = |text: &str| text.find('.').map_or_else(|| whole(text), |at| text[..at].chars().count());
    let left = cells.iter().map(|text| before(text)).max().unwrap_or(0);
    let padded: Vec<String> =
        cells.iter().map(|text| format!("{}{text}", " ".repeat(left - before(text)))).collect();
    let width = padded.iter().map(|text| text.chars().count()).max().unwrap_or(0);
    padded.into_iter().map(|text| format!("{text:<width$}")).collect()
}

/// Characters before the first blank that follows a digit: the whole part of a text without point.
fn whole(text: &str) -> usize {
    let mut seen_digit = false;
    for (n, c) in text.chars().enumerate() {
        seen_digit |= c.is_ascii_digit();
        if seen_digit && !c.is_ascii_digit() {
            return n;
        }
    }
    text.chars().count()
}

/// The SI prefix for which `size` lies between 1 and 1000: its factor [1] and its name.
pub fn prefix(size: f64) -> (f64, &'static str) {
    const PREFIXES: [(f64, &str); 11] = [
        (1e-18, "a"),
        (1e-15, "f"),
        (1e-12, "p"),
        (1e-9, "n"),
        (1e-6, "µ"),
        (1e-3, "m"),
        (1.0, ""),
        (1e3, "k"),
        (1e6, "M"),
        (1e9, "G"),
        (1e12, "T"),
    ];
    if size == 0.0 || !size.is_finite() {
        return (1.0, "");
    }
    PREFIXES.into_iter().rev().find(|(factor, _)| *factor <= size).unwrap_or(PREFIXES[0])
}

/// Power of ten of the first digit of a positive number [1].
fn exponent(size: f64) -> i32 {
    if size == 0.0 {
        return 0;
    }
    // The logarithm alone is off by one just below and at powers of ten; the digits are not.
    format!("{size:e}").split_once('e').and_then(|(_, power)| power.parse().ok()).unwrap_or(0)
}

/// `value · 10^(−shift)`, in two steps so that no power of ten overflows.
fn shifted(value: f64, shift: i32) -> f64 {
    let half = shift / 2;
    value / 10f64.powi(half) / 10f64.powi(shift - half)
}

/// `bar · 10^places` rounded up to a whole number, forgiving the rounding of the product itself.
fn rounded_up(bar: f64, places: i32) -> f64 {
    let scaled = shifted(bar, -places);
    let nearest = scaled.round();
    if (scaled - nearest).abs() <= 1e-9 * nearest { nearest } else { scaled.ceil() }
}

/// `value` with that many decimal places; a negative count rounds to tens, hundreds and so on.
fn fixed(value: f64, places: i32) -> String {
    let text = if places < 0 {
        format!("{:.0}", shifted(shifted(value, -places).round(), places))
    } else {
        format!("{value:.*}", places as usize)
    };
    let is_zero = text.chars().all(|c| "-0.".contains(c));
    if is_zero { text.trim_start_matches('-').to_owned() } else { text }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn both(value: f64, bar: f64) -> (String, String) {
        let shown = with_bar(value, bar);
        (shown.value, shown.bar)
    }

    #[track_caller]
    fn shows(value: f64, bar: f64, expected: (&str, &str)) {
        let found = both(value, bar);
        assert_eq!((found.0.as_str(), found.1.as_str()), expected, "{value} with bar {bar}");
    }

    #[test]
    fn digits_are_cut_to_the_bar() {
        shows(6.4155114543, 0.00213, ("6.4155", "0.0022"));
        shows(-1.2371277443, 0.0021, ("-1.2371", "0.0021"));
        shows(31.15993895, 4.0, ("31.2", "4.0"));
        shows(123456.0, 2345.0, ("123500", "2400"));
        shows(5.0, 0.0996, ("5.00", "0.10"));
        shows(1.0, 1.0, ("1.0", "1.0"));
        shows(999.996, 0.01, ("999.996", "0.010"));
    }

    #[test]
    fn a_bar_is_never_rounded_down() {
        let mut bar: f64 = 1.0001e-9;
        while bar < 1e9 {
            let shown: f64 = with_bar(1e3, bar).bar.parse().unwrap();
            assert!(bar * (1.0 - 1e-9) <= shown && shown <= 1.1 * bar, "{bar} shown as {shown}");
            bar *= 1.37;
        }
    }

    #[test]
    fn less_than_its_bar_says_so() {
        shows(0.001, 0.0021, ("< 0.0021", "0.0021"));
        shows(-0.001, 0.0021, ("< 0.0021", "0.0021"));
        shows(0.0, 0.5, ("< 0.50", "0.50"));
        assert_eq!(cell(-0.001, 0.0021), "< 0.0021", "no ± after <");
    }

    #[test]
    fn zero_bars_minus_zero_and_huge_values() {
        shows(100.0, 0.0, ("100", "0"));
        shows(-0.0, 0.0, ("0", "0"));
        shows(1.0 / 3.0, 0.0, ("0.3333333", "0"));
        shows(1.23456e300, 1e297, ("1.2346e300", "0.0010e300"));
        shows(3e-300, 2e-301, ("3.00e-300", "0.20e-300"));
        shows(5e-324, 0.0, ("4.940656e-324", "0"));
        shows(f64::NAN, 1.0, ("not finite", "not finite"));
        shows(1.0, f64::INFINITY, ("not finite", "not finite"));
        shows(2.0, 1e-30, ("2.00000000000000", "0.00000000000001"));
        assert_eq!(fixed(-0.0004, 3), "0.000", "no minus before zero");
    }

    #[test]
    fn engineering_takes_the_prefix_of_the_value() {
        assert_eq!(engineering(31159.9, 12.0, "V"), "31.160 ± 0.012 kV");
        assert_eq!(engineering(0.0301501, 1.5e-5, "J"), "30.150 ± 0.015 mJ");
        assert_eq!(engineering(0.0, 0.0, "V"), "0 V");
        assert_eq!(engineering(100e3, 0.0, "V"), "100 kV");
        assert_eq!(engineering(1e-12, 4e-12, "C"), "< 4.0 pC");
    }

    #[test]
    fn places_share_their_decimals() {
        assert_eq!(place(&[1e-19, -0.012, 0.350], 1e-3), "(0.00, -12.00, 350.00)");
        assert_eq!(place(&[0.0; 3], 1e-3), "(0, 0, 0)");
    }

    #[test]
    fn points_stand_below_each_other() {
        let cells = ["6.4155 ± 0.0021", "-12.37 ± 0.21", "< 0.0021", "7"].map(str::to_owned);
        let aligned = align(&cells);
        assert_eq!(aligned[0], "  6.4155 ± 0.0021", "{aligned:?}");
        assert_eq!(aligned[1], "-12.37 ± 0.21    ", "{aligned:?}");
        assert_eq!(aligned[2], "< 0.0021         ", "{aligned:?}");
        assert_eq!(aligned[3], "  7              ", "{aligned:?}");
    }

    #[test]
    fn percentages_and_significant_digits() {
        assert_eq!(percent(0.11655, true), "+11.7 %");
        assert_eq!(percent(-0.11655, true), "-11.7 %");
        assert_eq!(percent(0.0, true), "0 %");
        assert_eq!(significant(999.9996, 6), "1000");
        assert_eq!(significant(12345678.0, 3), "1.23e7");
        assert_eq!(significant(1.5e-9, 3), "1.5e-9");
        assert_eq!(significant(-250.0, 2), "-250");
    }
}
