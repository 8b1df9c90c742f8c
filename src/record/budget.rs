//! The uncertainty budget as a table, one group a quantity.

use super::json::evaluation_letter;
use super::page::{Align, Table};
use super::quantities::find;
use super::rounding::{handy_unit, relative, significant};
use crate::measurement::Measurement;
use crate::uncertainty::{BudgetRow, combined};

/// The rows of the budget in the order in which they came, grouped by the quantity they belong to.
pub(super) fn budget_table(measurement: &Measurement) -> String {
    use Align::{Left, Right};
    let columns = [
        ("Source", Left),
        ("Type", Left),
        ("u of the input", Right),
        ("Contribution", Right),
        ("Share", Right),
        ("Deg. of freedom", Right),
    ];
    let mut table = Table::new(
        "Standard uncertainties (k = 1). Share: of the combined variance.",
        &columns,
    );
    let rows = &measurement.quantities.budget;
    let mut keys: Vec<&str> = Vec::new();
    for row in rows {
        if !keys.contains(&row.quantity) {
            keys.push(row.quantity);
        }
    }
    for key in keys {
        let of_key: Vec<BudgetRow> = rows
            .iter()
            .filter(|row| row.quantity == key)
            .cloned()
            .collect();
        let total = combined(&of_key);
        // A key that is not one of ours stands under its own name: a row must never vanish.
        let (title, unit) = find(&measurement.quantities, key)
            .map_or((key, "1"), |(words, quantity)| (words.title, quantity.unit));
        table.group(&format!(
            "{title}: combined u = {}",
            of_quantity(total, unit)
        ));
        for row in &of_key {
            budget_row(&mut table, row, total, unit);
        }
    }
    table.html()
}

fn budget_row(table: &mut Table, row: &BudgetRow, total: f64, unit: &str) {
    let share = if total > 0.0 {
        row.contribution * row.contribution / (total * total)
    } else {
        0.0
    };
    let source = if row.assumed {
        format!("{} (assumed)", row.source)
    } else {
        row.source.clone()
    };
    table.row(&[
        &source,
        evaluation_letter(row.evaluation),
        &small(row.u, row.unit),
        &of_quantity(row.contribution, unit),
        // What would round to 0 % is not nothing.
        &if share < 0.005 {
            "< 1 %".to_owned()
        } else {
            format!("{:.0} %", share * 100.0)
        },
        &row.degrees_of_freedom
            .map_or_else(|| "∞".to_owned(), |nu| format!("{nu:.0}")),
    ]);
}

/// An uncertainty in the unit of its quantity. One without a unit is no share of anything: ppm would be read as relative.
fn of_quantity(u: f64, unit: &str) -> String {
    if unit != "1" || u == 0.0 {
        return small(u, unit);
    }
    let power = u.abs().log10().floor();
    if power >= -3.0 {
        return significant(u, 2);
    }
    let raised: String = format!("{power:.0}").chars().map(superscript).collect();
    format!("{} × 10{raised}", significant(u / 10_f64.powf(power), 2))
}

fn superscript(character: char) -> char {
    const DIGITS: [char; 10] = ['⁰', '¹', '²', '³', '⁴', '⁵', '⁶', '⁷', '⁸', '⁹'];
    let digit = character
        .to_digit(10)
        .and_then(|digit| usize::try_from(digit).ok());
    digit
        .and_then(|digit| DIGITS.get(digit).copied())
        .unwrap_or('⁻')
}

/// A standard uncertainty with its unit, two digits; tiny ones in a smaller unit, so that a column does not fill with zeros.
fn small(u: f64, unit: &str) -> String {
    let (factor, name) = match unit {
        "1" if u.abs() < 1e-3 && u.abs() > 0.0 => return relative(u),
        "s" if u.abs() < 1e-3 => (1e6, "µs".to_owned()),
        "s" if u.abs() < 1.0 => (1e3, "ms".to_owned()),
        "m" if u.abs() < 1e-5 => (1e6, "µm".to_owned()),
        other => handy_unit(other, u),
    };
    format!("{} {name}", significant(u * factor, 2))
        .trim_end()
        .to_owned()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_small_uncertainty_without_a_unit_is_no_ppm() {
        assert_eq!(of_quantity(2.14e-7, "1"), "2.1 × 10⁻⁷");
        assert_eq!(of_quantity(0.0062, "1"), "0.0062");
        assert_eq!(of_quantity(3.8e-5, "s"), "38 µs");
    }
}
