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
        table.group(&format!("{title}: combined u = {}", small(total, unit)));
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
        &small(row.contribution, unit),
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
