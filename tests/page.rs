//! The page in a real browser: it opens, a click on a band shows its candidates, nothing is complained about.

use std::fs;
use std::path::{Path, PathBuf};
use std::process::Command;

fn browser() -> Option<PathBuf> {
    let path = std::env::var_os("PATH")?;
    let names = ["chromium", "chromium-browser", "google-chrome"];
    std::env::split_paths(&path).flat_map(|folder| names.map(|n| folder.join(n))).find(|p| p.is_file())
}

/// Runs the browser on a page; its standard output.
fn open(browser: &Path, page: &Path, more: &[String]) -> String {
    let profile = tempfile::tempdir().unwrap();
    let output = Command::new(browser)
        .args(["--headless", "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run"])
        .args(["--disable-background-networking", "--disable-component-update", "--disable-sync", "--hide-scrollbars"])
        .arg("--virtual-time-budget=4000")
        .arg(format!("--user-data-dir={}", profile.path().display()))
        .args(more)
        .arg(format!("file://{}", page.display()))
        .output()
        .unwrap();
    String::from_utf8_lossy(&output.stdout).into_owned()
}

/// Watches for complaints from the first line of the page on.
const WATCH: &str = "<script>window.complaints=[];console.error=function(){complaints.push([].join.call(arguments,' '))};\
                     addEventListener('error',function(e){complaints.push(e.message)});</script>";

/// Clicks the third band by its button and the fifth on the plot, and writes what is then read into the page.
const CLICK: &str = "<script>setTimeout(function(){var d=document,r=d.documentElement.dataset,\
    read=function(){return d.querySelector('#details h2').textContent+' | '+d.querySelector('#candidates tbody th').textContent};\
    r.before=read();d.querySelectorAll('.bands button')[2].click();r.button=read();\
    var over=d.querySelector('.u-over'),b=over.getBoundingClientRect(),\
    data=JSON.parse(d.getElementById('data').textContent),x=data.spectrum.wavenumbers,band=data.report.bands[4],\
    at=(band.observed_cm1-x[0])/(x[x.length-1]-x[0])*b.width;\
    ['mouseenter','mousemove','mousedown','mouseup','click'].forEach(function(kind){over.dispatchEvent(new MouseEvent(kind,\
    {clientX:b.left+at,clientY:b.top+b.height/2,bubbles:true,detail:1}));});r.plot=read();\
    r.complaints=complaints.join(' ; ');},800);</script>";

/// The value of a data attribute in dumped HTML.
fn attribute(html: &str, name: &str) -> String {
    let start = html.find(&format!("data-{name}=\"")).unwrap_or_else(|| panic!("no data-{name}")) + name.len() + 7;
    html[start..].split('"').next().unwrap().to_owned()
}

#[test]
fn a_click_on_a_band_shows_its_candidates() {
    let Some(browser) = browser() else {
        eprintln!("skipped: no browser on this machine");
        return;
    };
    let folder = tempfile::tempdir().unwrap();
    let page = folder.path().join("gypsum.html");
    let run = Command::new(env!("CARGO_BIN_EXE_bandwright"))
        .args(["assign", "gypsum", "--spectrum", "examples/spectra/gypsum_beckman.csv", "--medium", "air"])
        .args(["--trials", "19", "--format", "html", "--out"])
        .arg(&page)
        .output()
        .unwrap();
    assert!(matches!(run.status.code(), Some(0 | 1)), "{}", String::from_utf8_lossy(&run.stderr));
    let html = fs::read_to_string(&page).unwrap();
    assert!(!html.contains("http://") || !html.contains("<link"), "the page reaches out");
    let watched = folder.path().join("watched.html");
    let text = html.replacen("<main", &format!("{WATCH}<main"), 1).replacen("</html>", &format!("{CLICK}</html>"), 1);
    fs::write(&watched, text).unwrap();

    let seen = open(&browser, &watched, &["--window-size=1400,1000".to_owned(), "--dump-dom".to_owned()]);
    assert_eq!(attribute(&seen, "complaints"), "");
    let (before, button, plot) = (attribute(&seen, "before"), attribute(&seen, "button"), attribute(&seen, "plot"));
    assert!(before.starts_with("Band b1 at"), "{before}");
    // The third band of gypsum is stretch + bend at 1.944 µm, the fifth a stretch overtone.
    assert!(button.starts_with("Band b3 at") && button.contains("bend"), "{button}");
    assert!(plot.starts_with("Band b5 at") && plot.contains("OH"), "{plot}");

    fs::create_dir_all("tests/output").unwrap();
    for (name, size) in [("wide", "1400,1400"), ("narrow", "420,1600")] {
        let picture = std::env::current_dir().unwrap().join(format!("tests/output/gypsum_{name}.png"));
        let _ = fs::remove_file(&picture);
        let more = [format!("--window-size={size}"), format!("--screenshot={}", picture.display())];
        open(&browser, &page, &more);
        assert!(fs::metadata(&picture).is_ok_and(|m| m.len() > 10_000), "no picture {}", picture.display());
    }
}
