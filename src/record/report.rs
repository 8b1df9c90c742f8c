//! `report.html`: one page that a colleague can read, print on A4 and repeat. No network, no script.
//!
//! The answers come first, then the figures, then the evidence, then the budget and how to repeat the run.

use super::budget::budget_table;
use super::error::RecordError;
use super::facts::facts_html;
use super::illustrations::{film_pictures, loss_plots, motion_plots};
use super::laws::laws_table;
use super::page::{Align, Table, escape, page, paragraph, section};
use super::quantities::named;
use super::rounding::{significant, with_u};
use super::shown::shown;
use crate::measurement::Measurement;
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
        section("Laws of loss tried", &laws_table(&measurement.fit.laws)),
        section(
            "Where the uncertainty comes from",
            &budget_table(measurement),
        ),
        section("Warnings", &warnings(measurement)),
        section("Clock, tracking and scale", &facts_html(measurement)),
        section("How to repeat this", &repeat(measurement)),
        section("What the figures mean", &glossary(measurement)),
        foot(),
    ];
    Ok(page(
        &format!("{}: free oscillation", measurement.source_name),
        &body.concat(),
    ))
}

fn head(measurement: &Measurement) -> String {
    let fit = &measurement.fit;
    let kind = if measurement.film.is_some() {
        "film"
    } else {
        "table of positions"
    };
    format!(
        "<header>\n<h1>Free oscillation of {}</h1>\n<p class=\"lead\">Measured from a {kind}: <span>{} readings</span> over <span>{} s</span>, \
         <span>{} cycles</span>. Uncertainties are expanded to 95 % unless another level is named.</p>\n</header>\n",
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
                significant(verdict.ratio, 2)
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
        Answer::No => {
            "<svg viewBox=\"0 0 20 20\" aria-hidden=\"true\"><circle cx=\"10\" cy=\"10\" r=\"8\"/><path d=\"M6 10H14\"/></svg>"
        }
        Answer::Undecided => {
            "<svg viewBox=\"0 0 20 20\" aria-hidden=\"true\"><path d=\"M10 1.5L18.5 10L10 18.5L1.5 10Z\"/></svg>"
        }
    }
}

fn capitalised(words: &str) -> String {
    let mut rest = words.chars();
    rest.next().map_or_else(String::new, |first| {
        first.to_uppercase().chain(rest).collect()
    })
}

fn key_figures(measurement: &Measurement) -> String {
    use Align::{Left, Right, Whole};
    let columns = [
        ("Quantity", Left),
        ("", Left),
        ("Value", Right),
        ("95 %", Whole),
        ("Unit", Left),
        ("Relative", Right),
    ];
    let mut table = Table::new(
        "Value and expanded uncertainty, both to two digits of the uncertainty.",
        &columns,
    );
    for (words, quantity) in named(&measurement.quantities) {
        let text = shown(quantity, words.percent);
        table.row(&[
            words.title,
            words.symbol,
            &text.value,
            &text.spread,
            &text.unit,
            &text.relative,
        ]);
    }
    if let Some(energy) = &measurement.energy {
        let mass = match energy.u_mass_kg {
            Some(u_kg) => with_u(energy.mass_kg, u_kg),
            None => format!("{} (taken as exact)", energy.mass_kg),
        };
        table.group(&format!("With the moving mass in kg: {mass}"));
        let rows = [
            ("Stiffness", "k", &energy.stiffness),
            ("Energy at the start", "E", &energy.energy_at_start),
            (
                "Energy lost in the first cycle",
                "ΔE",
                &energy.energy_lost_first_cycle,
            ),
        ];
        for (title, symbol, quantity) in rows {
            let text = shown(quantity, false);
            table.row(&[
                title,
                symbol,
                &text.value,
                &text.spread,
                &text.unit,
                &text.relative,
            ]);
        }
    }
    table.html()
}

fn warnings(measurement: &Measurement) -> String {
    if measurement.warnings.is_empty() {
        return paragraph("None.");
    }
    let items: String = measurement
        .warnings
        .iter()
        .map(|warning| format!("<li>{}</li>\n", escape(&warning.sentence)))
        .collect();
    format!("<ol class=\"warnings\">\n{items}</ol>\n")
}

fn repeat(measurement: &Measurement) -> String {
    let what = if measurement.film.is_some() {
        "the clip"
    } else {
        "the table"
    };
    let words = format!(
        "Run this in the folder of this report; or save the sheet below as run.toml beside {what} and run it there:"
    );
    let command = "ebbmark measure run.toml";
    format!(
        "{}<pre>{}</pre>\n<p>Version {}. The same source and sheet give the same files, byte for byte.</p>\n<pre>{}</pre>\n",
        paragraph(&words),
        command,
        env!("CARGO_PKG_VERSION"),
        escape(&measurement.sheet_toml)
    )
}

fn glossary(measurement: &Measurement) -> String {
    let quantities = named(&measurement.quantities)
        .map(|(words, _)| (format!("{}, {}", words.title, words.symbol), words.meaning));
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
        paragraph(
            "Local rules and licensed practice come first; a measurement does not replace an inspection that the law asks for."
        )
    )
}
