//! One self-contained page: no network, every number also in a table.
//!
//! Plotting with zoom is uPlot 1.6.32 (MIT); its licence stands in every page.

use serde::Serialize;

use super::drawing::{ExpectedSpectrum, PlottedSpectrum, expected};
use super::report::{AssignReport, PredictReport};

const PLOT_SCRIPT: &str = include_str!("assets/uplot-1.6.32.min.js");
const PLOT_STYLE: &str = include_str!("assets/uplot-1.6.32.min.css");
const PLOT_LICENCE: &str = include_str!("assets/uplot-LICENSE");
const SCRIPT: &str = include_str!("assets/page.js");
const STYLE: &str = include_str!("assets/page.css");

/// What the script of the page reads.
#[derive(Serialize)]
struct Data<'a, R> {
    kind: &'a str,
    report: &'a R,
    spectrum: Option<&'a PlottedSpectrum>,
    expected: Option<ExpectedSpectrum>,
}

/// The page of an assignment, over the measured spectrum where there is one.
pub fn assign(report: &AssignReport, spectrum: Option<&PlottedSpectrum>) -> String {
    page(&report.table.name, &Data { kind: "assign", report, spectrum, expected: None })
}

/// The page of a prediction, with its expected spectrum.
pub fn predict(report: &PredictReport) -> String {
    page(&report.table.name, &Data { kind: "predict", report, spectrum: None, expected: Some(expected(report)) })
}

fn page<R: Serialize>(title: &str, data: &Data<'_, R>) -> String {
    // `<` never reaches the parser of the page from a user's text: it is written as its JSON escape.
    let json = serde_json::to_string(data).unwrap_or_else(|_| "null".to_owned()).replace('<', "\\u003c");
    let title = title.replace('&', "&amp;").replace('<', "&lt;");
    format!(
        "<!doctype html>\n<html lang=\"en\">\n<meta charset=\"utf-8\">\n\
         <meta name=\"viewport\" content=\"width=device-width, initial-scale=1\">\n<title>{title}</title>\n\
         <!-- uPlot 1.6.32\n{PLOT_LICENCE}-->\n<style>{PLOT_STYLE}\n{STYLE}</style>\n<main id=\"main\"></main>\n\
         <noscript>This page draws with a script; use another form of the answer without one.</noscript>\n\
         <script type=\"application/json\" id=\"data\">{json}</script>\n<script>{PLOT_SCRIPT}</script>\n\
         <script>{SCRIPT}</script>\n</html>\n"
    )
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_users_text_cannot_close_the_script_that_carries_it() {
        let mut report = AssignReport { sample: "</script><script>alert(1)</script>".to_owned(), ..Default::default() };
        report.table.name = "<b>&".to_owned();
        let html = assign(&report, None);
        assert!(!html.contains("alert(1)</script>"));
        assert!(html.contains("<title>&lt;b>&amp;</title>"));
        assert_eq!(html, assign(&report, None));
    }
}
