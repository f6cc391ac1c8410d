//! Headers that name a channel and its unit.

use crate::template::TimeUnit;

/// Units that a name may end in after an underscore (`pressure_bar`). Short
/// letters that are parts of ordinary names as often as units (`m`, `a`, `v`)
/// are left out, except where the name before them is `time`.
const SUFFIXES: &[&str] = &[
    "mm", "cm", "km", "bar", "mbar", "kpa", "mpa", "degc", "kw", "mw", "kg", "rpm", "hz", "khz",
    "percent", "ms", "us", "min",
];

/// A header such as `pressure [bar]` or `pressure_bar` as name and unit.
pub(super) fn name_and_unit(header: &str) -> (String, Option<String>) {
    if let Some(rest) = header.strip_suffix(']')
        && let Some((name, unit)) = rest.rsplit_once('[')
        && !name.trim().is_empty()
    {
        let unit = unit.trim();
        return (
            name.trim().to_owned(),
            (!unit.is_empty()).then(|| unit.to_owned()),
        );
    }
    if let Some((name, suffix)) = header.rsplit_once('_')
        && !name.is_empty()
        && SUFFIXES.contains(&suffix.to_ascii_lowercase().as_str())
    {
        return (name.to_owned(), Some(suffix.to_owned()));
    }
    (header.to_owned(), None)
}

/// Whether a header is that of the time column, and in which unit: `time`,
/// `time [ms]`, `time_s`. Seconds where it does not say.
pub(super) fn time_unit(header: &str) -> Option<TimeUnit> {
    let lower = header.to_ascii_lowercase();
    let rest = lower.strip_prefix("time")?.trim();
    if rest.is_empty() {
        return Some(TimeUnit::Second);
    }
    let unit = rest.strip_prefix('_').or_else(|| {
        rest.strip_prefix('[')
            .and_then(|rest| rest.strip_suffix(']'))
    })?;
    TimeUnit::from_name(unit.trim())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn units_are_found_where_people_write_them() {
        let split = |header: &str| {
            let (name, unit) = name_and_unit(header);
            (name, unit.unwrap_or_default())
        };
        let pair = |name: &str, unit: &str| (name.to_owned(), unit.to_owned());
        assert_eq!(split("pressure [bar]"), pair("pressure", "bar"));
        assert_eq!(split("car speed [mm/s]"), pair("car speed", "mm/s"));
        assert_eq!(split("pressure_bar"), pair("pressure", "bar"));
        assert_eq!(split("acc_x"), pair("acc_x", ""));
        assert_eq!(split("phase_a"), pair("phase_a", ""));
        assert_eq!(time_unit("time"), Some(TimeUnit::Second));
        assert_eq!(time_unit("Time [ms]"), Some(TimeUnit::Millisecond));
        assert_eq!(time_unit("time_min"), Some(TimeUnit::Minute));
        assert_eq!(time_unit("timer"), None);
    }
}
