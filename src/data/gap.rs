//! Cells without a value, kept in the columns themselves: a number column marks them by NaNs that no parser makes, a
//! category column by codes no label gets. So a clean column costs nothing and rows keep their places.

/// Why a row has no value in a column.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Gap {
    /// The cell holds a missing mark (or an input of a derived value does).
    Missing,
    /// The cell could not be read as what the column should hold.
    Unreadable,
    /// A derived value is not finite though its inputs are there.
    Undefined,
    /// A derived value was not tried because an input could not be read.
    Untried,
}

const BASE: u64 = 0x7ff8_4755_594c_0000;
const ALL: [Gap; 4] = [Gap::Missing, Gap::Unreadable, Gap::Undefined, Gap::Untried];

/// Codes from here on are no labels.
pub(super) const CODE_LIMIT: u32 = u32::MAX - 8;

impl Gap {
    /// As a cell of a number column.
    pub(super) fn number(self) -> f64 {
        f64::from_bits(BASE + self as u64)
    }

    /// As a cell of a category column.
    pub(super) fn code(self) -> u32 {
        CODE_LIMIT + self as u32
    }

    /// The gap a number stands for, if it is one.
    pub(super) fn of_number(x: f64) -> Option<Gap> {
        if !x.is_nan() {
            return None;
        }
        // A NaN from arithmetic is an undefined value.
        let place = x.to_bits().wrapping_sub(BASE);
        Some(ALL.get(usize::try_from(place).unwrap_or(usize::MAX)).copied().unwrap_or(Gap::Undefined))
    }

    /// The gap a code stands for, if it is one.
    pub(super) fn of_code(code: u32) -> Option<Gap> {
        code.checked_sub(CODE_LIMIT).map(|i| ALL.get(i as usize).copied().unwrap_or(Gap::Unreadable))
    }
}

#[cfg(test)]
mod tests {
    use super::{ALL, Gap};

    #[test]
    fn survives_the_way_through_a_column() {
        for gap in ALL {
            assert_eq!(Gap::of_number(gap.number()), Some(gap));
            assert_eq!(Gap::of_code(gap.code()), Some(gap));
        }
        assert_eq!(Gap::of_number(f64::NAN), Some(Gap::Undefined));
        assert_eq!(Gap::of_number(-f64::NAN), Some(Gap::Undefined));
        assert_eq!(Gap::of_number(0.0), None);
        assert_eq!(Gap::of_number(f64::INFINITY), None);
        assert_eq!(Gap::of_code(7), None);
    }
}
