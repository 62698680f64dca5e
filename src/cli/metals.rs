//! `pinchbar metals`: the metals table, every figure with its source and how well it is founded.

use super::{Ending, terminal};
use crate::problem::material::{Evidence, METALS, TabledResistivity};
use crate::report;
use crate::report::words::wrapped;
use serde::Serialize;
use std::io;

/// One figure as it is printed.
#[derive(Serialize)]
struct Row {
    metal: &'static str,
    figure: String,
    value: f64,
    evidence: &'static str,
    source: &'static str,
}

/// Runs the command.
///
/// # Errors
/// When stdout cannot be written.
pub fn run(json: bool) -> io::Result<Ending> {
    let text = if json { report::json::json(&rows()).map_err(io::Error::other)? } else { table() };
    terminal::print(&text)?;
    Ok(Ending::Done)
}

fn rows() -> Vec<Row> {
    let mut rows = Vec::new();
    for metal in METALS {
        let mut row = |figure: String, value: f64, evidence: Evidence, source: &'static str| {
            rows.push(Row { metal: metal.name, figure, value, evidence: evidence.words(), source });
        };
        match metal.resistivity {
            TabledResistivity::Linear { at_20, alpha } => {
                row("resistivity_uohm_cm at 20 C".into(), at_20.value, at_20.evidence, at_20.source);
                row("alpha_per_k".into(), alpha.value, alpha.evidence, alpha.source);
            }
            TabledResistivity::Table { rows, evidence, source } => {
                rows.iter().for_each(|&(celsius, value)| row(format!("resistivity_uohm_cm at {celsius:.1} C"), value, evidence, source));
            }
        }
        for (name, f) in [
            ("conductivity_w_mk", metal.conductivity_w_mk),
            ("density_g_cm3", metal.density_g_cm3),
            ("heat_capacity_j_kgk", metal.heat_capacity_j_kgk),
            ("melting_c", metal.melting_c),
        ] {
            row(name.into(), f.value, f.evidence, f.source);
        }
    }
    rows
}

/// The table within 80 columns; sources are numbered and stand below it.
fn table() -> String {
    let head =
        "Metals by the name used in a sheet. Lots differ by some per cent, commercial nickel and plated steel by more: measure yours.";
    let mut text = String::new();
    write(&mut text, "", head);
    let mut sources: Vec<&str> = Vec::new();
    let mut last = "";
    for row in rows() {
        if row.metal != last {
            let description = METALS.iter().find(|m| m.name == row.metal).map_or("", |m| m.description);
            text.push('\n');
            write(&mut text, "", &format!("{}: {description}", row.metal));
            last = row.metal;
        }
        let number = sources.iter().position(|s| *s == row.source).unwrap_or_else(|| {
            sources.push(row.source);
            sources.len() - 1
        });
        let value = format!("{:.4}", row.value);
        let value = value.trim_end_matches('0').trim_end_matches('.');
        text += &format!("  {:30} {value:>8}  {} [{}]\n", row.figure, row.evidence, number + 1);
    }
    text += "\nSources\n";
    for (i, source) in sources.iter().enumerate() {
        write(&mut text, &format!("  {:>4} ", format!("[{}]", i + 1)), source);
    }
    text
}

/// Words in lines of at most 80 characters, the first after a mark, the others below each other.
fn write(text: &mut String, mark: &str, words: &str) {
    for (i, line) in wrapped(words, 80 - mark.len()).into_iter().enumerate() {
        let mark = if i == 0 { mark.to_string() } else { " ".repeat(mark.len()) };
        *text += &format!("{mark}{line}\n");
    }
}
