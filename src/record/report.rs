//! `report.html`: one page that a colleague can read, print on A4 and repeat. No network, no script.
//!
//! The answers come first, then the figures, then the evidence, then the budget and how to repeat the run.

use super::error::RecordError;
use super::facts::{facts_html, residual_size};
use super::json::evaluation_letter;
use super::overlay::start_frame;
use super::page::{Align, Table, escape, figure, page, paragraph, section};
use super::picture::data_url;
use super::plots;
use super::quantities::{named, title_of};
use super::rounding::{handy_unit, relative, shown, significant};
use super::streak::streak_png_for_page;
use crate::measurement::Measurement;
use crate::motion::LawTrial;
use crate::uncertainty::{BudgetRow, combined};
use crate::verdict::{Answer, Verdict};

/// The report as one self-contained HTML page.
///
/// Everything a user wrote (file name, sheet) is shown as text, never as markup.
///
/// # Errors
/// [`RecordError::Compose`] where a picture or a plot cannot be made.
pub fn report_html(measurement: &Measurement) -> Result<String, RecordError> {
    let body = [
        head(measurement),
        section("Answers", &verdicts(&measurement.verdicts)),
        section("Key figures", &key_figures(measurement)),
        section("What was filmed", &film_pictures(measurement)?),
        section("The motion and the fit", &motion_plots(measurement)?),
        section("The loss", &loss_plots(measurement)?),
        section("Laws of loss tried", &laws(&measurement.fit.laws)),
        section("Where the uncertainty comes from", &budget(measurement)),
        section("Warnings", &warnings(measurement)),
        section("Clock, tracking and scale", &facts_html(measurement)),
        section("How to repeat this", &repeat(measurement)),
        section("What the figures mean", &glossary(measurement)),
        foot(),
    ];
    Ok(page(&format!("{}: free oscillation", measurement.source_name), &body.concat()))
}

fn head(measurement: &Measurement) -> String {
    let fit = &measurement.fit;
    let kind = if measurement.film.is_some() { "film" } else { "table of positions" };
    format!(
        "<header>\n<h1>Free oscillation of {}</h1>\n<p class=\"lead\">Measured from a {kind}: <span>{} readings</span> over <span>{} s</span>, \
         <span>{} cycles</span>. Uncertainties are expanded to 95 % unless another is named.</p>\n</header>\n",
        escape(&measurement.source_name),
        fit.residual.n_used,
        significant(fit.t_end_s - fit.t_ref_s, 4),
        measurement.cycles.len()
    )
}

fn verdicts(verdicts: &[Verdict]) -> String {
    if verdicts.is_empty() {
        return String::new();
    }
    let items: String = verdicts
        .iter()
        .map(|verdict| {
            format!(
                "<li><div class=\"word\">{}{}</div><div><h3>{}</h3><p>{}</p><p class=\"basis\">{}: {}</p></div></li>\n",
                shape(verdict.answer),
                verdict.answer.word(),
                escape(verdict.asked),
                escape(&verdict.sentence),
                escape(&capitalised(verdict.ratio_of)),
                significant(verdict.ratio, 3)
            )
        })
        .collect();
    format!("<ul class=\"verdicts\">\n{items}</ul>\n")
}

/// An answer's shape, told apart without colour: a full disc, an open ring with a bar, an open diamond. The word follows it.
fn shape(answer: Answer) -> &'static str {
    match answer {
        Answer::Yes => {
            "<svg viewBox=\"0 0 20 20\" aria-hidden=\"true\"><circle class=\"solid\" cx=\"10\" cy=\"10\" r=\"8\"/>\
             <path class=\"on-solid\" d=\"M6 10.5L9 13.5L14 7\"/></svg>"
        }
        Answer::No => "<svg viewBox=\"0 0 20 20\" aria-hidden=\"true\"><circle cx=\"10\" cy=\"10\" r=\"8\"/><path d=\"M6 10H14\"/></svg>",
        Answer::Undecided => "<svg viewBox=\"0 0 20 20\" aria-hidden=\"true\"><path d=\"M10 1.5L18.5 10L10 18.5L1.5 10Z\"/></svg>",
    }
}

fn capitalised(words: &str) -> String {
    let mut rest = words.chars();
    rest.next().map_or_else(String::new, |first| first.to_uppercase().chain(rest).collect())
}

fn key_figures(measurement: &Measurement) -> String {
    use Align::{Left, Right};
    let columns = [("Quantity", Left), ("", Left), ("Value", Right), ("95 %", Left), ("Unit", Left), ("Relative", Right)];
    let mut table = Table::new("Value and expanded uncertainty, both to two digits of the uncertainty.", &columns);
    for entry in named(&measurement.quantities) {
        let text = shown(entry.quantity, entry.percent);
        table.row(&[entry.title, entry.symbol, &text.value, &text.spread, &text.unit, &text.relative]);
    }
    if let Some(energy) = &measurement.energy {
        table.group(&format!("With the mass of {} kg", significant(energy.mass_kg, 6)));
        let rows = [
            ("Stiffness", "k", &energy.stiffness),
            ("Energy at the start", "E", &energy.energy_at_start),
            ("Energy lost in the first cycle", "ΔE", &energy.energy_lost_first_cycle),
        ];
        for (title, symbol, quantity) in rows {
            let text = shown(quantity, false);
            table.row(&[title, symbol, &text.value, &text.spread, &text.unit, &text.relative]);
        }
    }
    table.html()
}

fn film_pictures(measurement: &Measurement) -> Result<String, RecordError> {
    let Some(film) = &measurement.film else { return Ok(String::new()) };
    let mut html = figure(
        "Start frame with marker box, motion axis and scale bar",
        &start_frame(film, measurement.fit.amplitude_m)?,
        &format!(
            "Frame {} with the marker's box, the motion axis (x = 0 at the cross stroke, x grows towards the arrow) and the scale bar.",
            film.at_frame
        ),
    );
    if let Some(png) = streak_png_for_page(measurement)? {
        let image = format!("<img src=\"{}\" alt=\"The marker's track in time as the film saw it, with the fitted curve over it\">", data_url(&png));
        html.push_str(&figure(
            "Streak picture",
            &image,
            "Streak: one line of every frame along the motion axis, side by side in time (to the right); x grows upwards. The fitted curve lies over \
             the marker's track. The strip at the foot is dark where the marker was lost.",
        ));
    }
    Ok(html)
}

fn motion_plots(measurement: &Measurement) -> Result<String, RecordError> {
    let mut html = figure(
        "Position against time, readings and fit",
        &plots::motion(measurement)?,
        "Position against time: readings (circles), readings left out (crosses), fitted x(t) = A e^(−γt) cos(ωt + φ) + c (line).",
    );
    if let Some(close) = plots::motion_close(measurement)? {
        html.push_str(&figure("The first cycles, readings and fit", &close, "The first four cycles of the same."));
    }
    html.push_str(&figure(
        "Residuals against time",
        &plots::residuals(measurement)?,
        &format!("Residuals, reading minus fit: {} rms.", residual_size(measurement)),
    ));
    Ok(html)
}

fn loss_plots(measurement: &Measurement) -> Result<String, RecordError> {
    let mut html = String::new();
    if let Some(envelope) = plots::envelope(measurement)? {
        let caption = "Amplitude of each cycle, fitted to its readings alone, with its 95 % bar; the line is A e^(−γt). On this axis viscous loss is \
                       a straight line, dry friction bends down, drag bends up.";
        html.push_str(&figure("Amplitude of each cycle on a logarithmic axis", &envelope, caption));
    }
    if let Some(energy) = plots::energy(measurement)? {
        let caption = if measurement.energy.is_some() {
            "Energy ½kA² of each cycle with its 95 % bar; the line is the fit."
        } else {
            "Energy of each cycle over that of the cycle before, with its 95 % bar; the line is the fitted constant e^(−2δ)."
        };
        html.push_str(&figure("Energy per cycle", &energy, caption));
    }
    Ok(html)
}

fn laws(laws: &[LawTrial]) -> String {
    use Align::{Left, Right};
    let mut table = Table::new("", &[("Law", Left), ("Parameters", Left), ("Misfit, mm", Right), ("AICc", Right), ("Stands", Left), ("Why", Left)]);
    let best = laws.iter().map(|law| law.aicc).fold(f64::INFINITY, f64::min);
    for law in laws {
        let parameters: Vec<String> = law
            .parameters
            .iter()
            .map(|(name, value, u, unit)| {
                let (factor, unit) = handy_unit(unit, *value);
                let figure = match u {
                    Some(u) => significant_with_u(*value * factor, *u * factor),
                    None => format!("{} (held)", significant(*value * factor, 4)),
                };
                format!("{name} = {figure} {unit}").trim_end().to_owned()
            })
            .collect();
        table.row(&[
            law.law,
            &parameters.join("; "),
            &significant(law.rms_m * 1e3, 3),
            &format!("best + {:.1}", law.aicc - best),
            if law.excluded { "no" } else { "yes" },
            &law.reason,
        ]);
    }
    table.html()
}

/// Value and standard uncertainty in the short form 1.2345(12) would need counting digits; this spells it out.
fn significant_with_u(value: f64, u: f64) -> String {
    let (value, u) = super::rounding::rounded(value, u);
    if u.is_empty() { value } else { format!("{value} (u = {u})") }
}

fn budget(measurement: &Measurement) -> String {
    use Align::{Left, Right};
    let columns =
        [("Source", Left), ("Type", Left), ("u of the input", Right), ("Contribution", Right), ("Share", Right), ("Degrees of freedom", Right)];
    let mut table = Table::new("Standard uncertainties (k = 1). Share: of the combined variance.", &columns);
    let rows = &measurement.quantities.budget;
    let mut keys: Vec<&str> = Vec::new();
    for row in rows {
        if !keys.contains(&row.quantity) {
            keys.push(row.quantity);
        }
    }
    for key in keys {
        let of_key: Vec<BudgetRow> = rows.iter().filter(|row| row.quantity == key).cloned().collect();
        let total = combined(&of_key);
        let unit = named(&measurement.quantities).iter().find(|entry| entry.key == key).map_or("1", |entry| entry.quantity.unit);
        table.group(&format!("{}: combined u = {}", title_of(&measurement.quantities, key), small(total, unit)));
        for row in &of_key {
            budget_row(&mut table, row, total, unit);
        }
    }
    table.html()
}

fn budget_row(table: &mut Table, row: &BudgetRow, total: f64, unit: &str) {
    let share = if total > 0.0 { row.contribution * row.contribution / (total * total) } else { 0.0 };
    let source = if row.assumed { format!("{} (assumed)", row.source) } else { row.source.clone() };
    table.row(&[
        &source,
        evaluation_letter(row.evaluation),
        &small(row.u, row.unit),
        &small(row.contribution, unit),
        &format!("{:.0} %", share * 100.0),
        &row.degrees_of_freedom.map_or_else(|| "∞".to_owned(), |nu| format!("{nu:.0}")),
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
    format!("{} {name}", significant(u * factor, 2)).trim_end().to_owned()
}

fn warnings(measurement: &Measurement) -> String {
    if measurement.warnings.is_empty() {
        return paragraph("None.");
    }
    let items: String = measurement.warnings.iter().map(|warning| format!("<li>{}</li>\n", escape(&warning.sentence))).collect();
    format!("<ol class=\"warnings\">\n{items}</ol>\n")
}

fn repeat(measurement: &Measurement) -> String {
    let words = "Save the sheet below as run.toml (it also lies beside this report), put the source next to it, and run:";
    let command = if measurement.film.is_some() { "ebbmark measure run.toml".to_owned() } else { format!("ebbmark refit {}", measurement.source_name) };
    format!(
        "{}<pre>{}</pre>\n<p>Version {}. The same source and sheet give the same files, byte for byte.</p>\n<pre>{}</pre>\n",
        paragraph(words),
        escape(&command),
        env!("CARGO_PKG_VERSION"),
        escape(&measurement.sheet_toml)
    )
}

fn glossary(measurement: &Measurement) -> String {
    let quantities = named(&measurement.quantities).map(|entry| (format!("{}, {}", entry.title, entry.symbol), entry.meaning));
    let general = [
        ("Standard uncertainty, u", "One standard deviation of what the true value may be, as far as is known."),
        ("Expanded uncertainty, ±", "An interval that holds the true value with 95 % confidence: about 2u where the data are many."),
        ("Type A, type B", "Evaluated from the scatter of this run; evaluated from other knowledge, such as a specification."),
        ("Undecided", "The data allow both answers. It is a result, not a failure; the sentence says what would decide."),
    ]
    .map(|(name, meaning)| (name.to_owned(), meaning));
    let rows: String = quantities
        .iter()
        .chain(&general)
        .map(|(name, meaning)| format!("<dt>{}</dt><dd>{}</dd>\n", escape(name), escape(meaning)))
        .collect();
    format!("<dl>\n{rows}</dl>\n")
}

/// The cautions that stand at the foot of every report.
fn foot() -> String {
    format!(
        "<aside class=\"cautions\">\n<h2>Cautions</h2>\n{}{}</aside>\n",
        paragraph(
            "Stretched springs and falling masses can hurt: wear eye protection, keep feet and faces clear, and secure masses before a spring is \
             loaded. An air-cushion rail's blower runs on mains power: keep leads dry and whole, and leave its inside to those who may open it."
        ),
        paragraph("Local rules and licensed practice come first; a measurement does not replace an inspection that the law asks for.")
    )
}
