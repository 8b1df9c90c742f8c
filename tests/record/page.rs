//! The report and the summary: safe to open, readable without colour, the answers first.

use ebbmark::measurement::Measurement;
use ebbmark::record::{report_html, summary};

use crate::record::double::Double;

const HOSTILE: &str = "<script>alert(1)</script>\"'& .mov";
/// Four A4 pages of pictures; a mail server takes it.
const MAX_REPORT_BYTES: usize = 1_500_000;

fn report(measurement: &Measurement) -> String {
    report_html(measurement).unwrap()
}

/// The report without the pictures, whose base64 could hold any letters.
fn without_pictures(html: &str) -> String {
    html.split("data:image/png;base64,")
        .map(|part| {
            part.trim_start_matches(|c: char| c.is_ascii_alphanumeric() || "+/=".contains(c))
        })
        .collect()
}

#[test]
fn a_hostile_file_name_stays_text() {
    let mut measurement = Double::film(300).named(HOSTILE).build();
    measurement.sheet_toml = format!("clip = '{HOSTILE}'\n</pre><img src=x onerror=alert(1)>");
    measurement.warnings[0].sentence = HOSTILE.to_owned();
    let html = without_pictures(&report(&measurement));
    assert!(!html.contains("<script") && !html.contains("<img src=x"));
    assert!(html.contains("&lt;script&gt;alert(1)&lt;/script&gt;&quot;&#39;&amp; .mov"));
}

#[test]
fn the_report_asks_for_nothing_from_anywhere() {
    for double in [Double::film(900).with_mass(), Double::table(900)] {
        let html = without_pictures(&report(&double.build()));
        let without_namespace = html.replace("xmlns=\"http://www.w3.org/2000/svg\"", "");
        for word in [
            "http:", "https:", "//www", "<script", "<link", "@import", "url(", "onload", "onclick",
        ] {
            assert!(!without_namespace.contains(word), "{word}");
        }
    }
}

#[test]
fn the_answers_come_first_and_in_words() {
    let html = report(&Double::film(300).build());
    let at = |text: &str| {
        html.find(text)
            .unwrap_or_else(|| panic!("{text} is missing"))
    };
    let order = [
        "<h1>",
        ">Answers<",
        ">Key figures<",
        ">What was filmed<",
        ">The motion and the fit<",
        ">The loss<",
        ">Laws of loss tried<",
    ];
    let rest = [
        ">Where the uncertainty comes from<",
        ">Warnings<",
        ">Clock, tracking and scale<",
        ">How to repeat this<",
        ">Cautions<",
    ];
    let places: Vec<usize> = order.iter().chain(&rest).map(|text| at(text)).collect();
    assert!(places.is_sorted(), "{places:?}");
    for word in ["</svg>yes</div>", "</svg>no</div>", "</svg>undecided</div>"] {
        at(word);
    }
    at("ebbmark measure run.toml");
}

#[test]
fn a_command_copied_from_the_page_does_nothing_else() {
    // The command names no file of the user's, so that no name can end it and begin another.
    let html = report(&Double::table(300).named("a; rm -r 'b'.csv").build());
    assert!(html.contains("<pre>ebbmark measure run.toml</pre>"));
    assert_eq!(
        html.matches("<pre>").count(),
        2,
        "the command and the sheet"
    );
}

#[test]
fn every_picture_says_what_it_shows() {
    let html = report(&Double::film(900).build());
    assert_eq!(
        html.matches("<figure>").count(),
        8,
        "start frame, two streaks, two of x(t), residuals, amplitude, energy"
    );
    assert_eq!(
        html.matches("<img ").count(),
        html.matches(" alt=\"").count()
    );
    assert_eq!(
        html.matches("role=\"img\"").count(),
        html.matches("aria-label=\"").count()
    );
    assert_eq!(html.matches("<h1>").count(), 1);
    assert!(html.contains("<html lang=\"en\">"));
}

/// The x of the words `text` on the start frame, display px, and how they are anchored.
fn words_on_still(html: &str, text: &str) -> (f64, String) {
    let end = html.find(&format!(">{text}</text>")).unwrap();
    let element = &html[html[..end].rfind("<text").unwrap()..end];
    let attribute = |name: &str| {
        element
            .split(&format!("{name}=\""))
            .nth(1)
            .unwrap()
            .split('"')
            .next()
            .unwrap()
            .to_owned()
    };
    (attribute(" x").parse().unwrap(), attribute("text-anchor"))
}

#[test]
fn words_on_an_upright_picture_stay_inside_it_and_off_the_marker() {
    let measurement = Double::film(300).upright().build();
    let html = report(&measurement);
    let (x_px, anchor) = words_on_still(&html, "200.0 mm");
    // 540 px wide, the bar at 420 px: beside it there is no room, so the words stand above its end.
    assert_eq!(anchor, "middle");
    assert!((420.0..500.0).contains(&x_px), "{x_px}");
    let (x_px, anchor) = words_on_still(&html, "marker");
    let [left, ..] = measurement.film.unwrap().marker_box_px;
    assert_eq!(anchor, "end");
    assert!(
        x_px < left,
        "the words end at {x_px}, the box begins at {left}"
    );
}

#[test]
fn figures_are_rounded_to_what_is_known() {
    let html = report(&Double::film(900).build());
    assert!(
        html.contains(">1.204352</td><td class=\"whole\">± 0.000069</td><td>s</td>"),
        "the period to two digits of U"
    );
    let html = report(&Double::film(900).with_open_bounds().build());
    assert!(
        html.contains(">≥ 56000</td><td class=\"whole\">(95 %, one-sided)</td>"),
        "Q is bounded from below"
    );
}

#[test]
fn a_minute_of_film_makes_a_page_that_can_be_mailed() {
    let html = report(&Double::film(3600).with_mass().build());
    assert!(html.len() < MAX_REPORT_BYTES, "{} bytes", html.len());
}

#[test]
fn a_measurement_without_anything_to_draw_still_makes_a_page() {
    let mut measurement = Double::table(300).build();
    measurement.cycles.clear();
    measurement.rows.clear();
    measurement.verdicts.clear();
    measurement.warnings.clear();
    measurement.fit.laws.clear();
    measurement.quantities.budget.clear();
    let html = report(&measurement);
    assert!(html.contains("<p>None.</p>"), "no warnings is worth saying");
    assert!(!html.contains(">Answers<") && !html.contains(">The loss<"));
}

#[test]
fn the_summary_tells_the_run_in_fifteen_lines() {
    let text = summary(&Double::film(900).build());
    assert!(text.lines().count() <= 15, "{text}");
    for words in [
        "yes: Each swing",
        "no: The loss",
        "1.204352 ± 0.000069 s",
        "0.024 px",
        "2 warnings",
        "85.20 ± 0.33 mm",
    ] {
        assert!(text.contains(words), "{words} is missing from\n{text}");
    }
    assert!(
        summary(&Double::table(900).with_open_bounds().build())
            .contains("≥ 56000 (95 %, one-sided)")
    );
}

#[test]
fn a_file_name_cannot_steer_the_terminal() {
    let text = summary(&Double::film(300).named("a\u{1b}[2J\rb.mov").build());
    assert!(text.starts_with("a[2Jb.mov\n"), "{text:?}");
}
