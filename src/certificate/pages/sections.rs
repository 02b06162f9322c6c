//! The sections of one run.

use super::pair;
use crate::bench::checks::CheckVerdict;
use crate::certificate::content::{
    Calibration, Comparison, Conformity, Equipment, Figure, File, Reference, Row,
};
use crate::certificate::paper::{
    Align, Block, Column, Emphasis, Level, Notice, Row as PaperRow, Table, Text,
};
use crate::quantity::unit::{Kind, lookup};
use crate::report::number::fixed;

/// Everything of one run, in order.
pub(super) fn calibration(of: &Calibration, level: Level) -> Vec<Block> {
    let heading = |text: &str| Block::Heading(level, text.to_owned());
    // The run as found stands under a heading of its own already.
    let title = if level == Level::Two { of.title } else { "The run" };
    let mut blocks = vec![heading(title), run(of)];
    blocks.extend(of.conformity.iter().map(conformity));
    blocks.push(heading("Flow against intermediate pressure"));
    blocks.push(flows(of));
    blocks.push(heading("Line"));
    blocks.push(Block::Paragraph(of.line.says.as_str().into()));
    blocks.push(line(of));
    blocks.push(heading("Points"));
    blocks.push(points(of));
    blocks.push(heading("Budget"));
    blocks.push(budget(of));
    blocks.push(heading("Checks"));
    blocks.push(checks(of));
    if let Some(before) = &of.before {
        blocks.push(heading("Against the calibration before"));
        blocks.push(Block::Paragraph(before.says.as_str().into()));
        blocks.push(comparison(before));
    }
    blocks.push(heading("Instruments"));
    blocks.push(equipment(&of.equipment));
    blocks.push(heading("Conditions"));
    blocks.push(conditions(of));
    if !of.warnings.is_empty() {
        blocks.push(Block::Notice(Notice {
            label: "To know".to_owned(),
            paragraphs: of
                .warnings
                .iter()
                .map(|warning| Text::plain(super::sentence_case(warning)))
                .collect(),
        }));
    }
    blocks
}

fn run(of: &Calibration) -> Block {
    let mut pairs = vec![
        pair("Run", of.run.as_str()),
        pair("Taken", of.taken.to_rfc3339()),
        pair("Purpose", of.purpose.name()),
        pair("Gas", of.gas.as_str()),
    ];
    pairs.extend(of.technician.as_ref().map(|name| pair("Measured by", name.as_str())));
    Block::Pairs { pairs, two_columns: true }
}

fn conformity(of: &Conformity) -> Block {
    let mut pairs = vec![
        pair("Verdict", Text::bold(of.word)),
        pair("Rule", of.rule),
        pair("Nominal flow", of.nominal.text()),
        pair("Limits of the flow", between(&of.limits)),
    ];
    pairs.extend(of.guarded.as_ref().map(|limits| pair("Limits less U", between(limits))));
    pairs.push(pair("Judged flow", of.judged.text()));
    pairs.push(pair("Probability of conformity", of.probability.as_str()));
    Block::Pairs { pairs, two_columns: true }
}

fn between([low, high]: &[Figure; 2]) -> String {
    format!("{} to {} {}", low.printed(), high.printed(), high.unit.symbol())
}

fn table(caption: Option<&str>, columns: Vec<Column>, rows: Vec<PaperRow>, row_heads: bool) -> Block {
    Block::Table(Table { caption: caption.map(Text::plain), columns, rows, row_heads })
}

fn or_dash(text: Option<String>) -> String {
    text.unwrap_or_else(|| "–".to_owned())
}

fn flows(of: &Calibration) -> Block {
    let oxygen = of.nominal.as_oxygen.is_some();
    let unit = of.nominal.flow.unit.symbol();
    let mut columns = vec![Column::numbers("IP", "bar"), Column::numbers("IP", "psi")];
    let flow = |columns: &mut Vec<Column>, head: String| {
        columns.push(Column::numbers(head, unit));
        columns.push(Column::numbers("± U", unit));
        columns.push(Column::new("k", Align::Decimal));
    };
    flow(&mut columns, format!("flow of {}", of.gas_of_result));
    if oxygen {
        flow(&mut columns, "as oxygen".to_owned());
    }
    let row = |row: &Row| {
        let mut cells = vec![row.ip.printed(), psi(&row.ip)];
        for figure in std::iter::once(&row.flow).chain(&row.as_oxygen) {
            cells.extend([figure.printed(), or_dash(figure.printed_expanded()), or_dash(figure.printed_k())]);
        }
        PaperRow::new(cells)
    };
    // The nominal pressure stands out in its place, or comes first where it has none.
    let is_nominal = |one: &Row| one.ip.printed() == of.nominal.ip.printed();
    let first = (!of.table.iter().any(is_nominal)).then(|| row(&of.nominal).with(Emphasis::Strong));
    let others =
        of.table.iter().map(|one| if is_nominal(one) { row(one).with(Emphasis::Strong) } else { row(one) });
    let rows = first.into_iter().chain(others).collect();
    let caption = format!(
        "Gauge pressure; {}; 95 %. The nominal pressure stands out.",
        Reference::StpdAtStandardAmbient.says()
    );
    table(Some(&caption), columns, rows, true)
}

/// A pressure in bar as psi, to a tenth.
fn psi(bar: &Figure) -> String {
    let factor = lookup(Kind::Pressure, "psi").map_or(f64::NAN, |unit| unit.factor);
    fixed(bar.value * 1e5 / factor, 1)
}

fn figure_columns() -> Vec<Column> {
    vec![
        Column::new("quantity", Align::Left),
        Column::new("value", Align::Decimal),
        Column::new("± U", Align::Decimal),
        Column::new("k", Align::Decimal),
        Column::new("unit", Align::Left),
    ]
}

fn figure_row(name: &str, figure: &Figure) -> PaperRow {
    let u = match figure.printed_interval() {
        Some((low, high)) => format!("{low} to {high}"),
        None => or_dash(figure.printed_expanded()),
    };
    let unit = match figure.unit.symbol() {
        "" => "–",
        symbol => symbol,
    };
    PaperRow::new([name.to_owned(), figure.printed(), u, or_dash(figure.printed_k()), unit.to_owned()])
}

fn line(of: &Calibration) -> Block {
    let (line, hole) = (&of.line, &of.hole);
    let mut rows =
        vec![figure_row(&line.intercept.name, &line.intercept), figure_row(&line.slope.name, &line.slope)];
    rows.extend(line.covariance.iter().map(|figure| figure_row(&figure.name, figure)));
    rows.extend(line.span.iter().map(|figure| figure_row(&format!("{}, absolute", figure.name), figure)));
    rows.extend(line.reduced_chi_square.iter().map(|figure| figure_row(&figure.name, figure)));
    let choke = format!("{}, 95 % interval; {}", hole.choke.figure.name, hole.choke.says);
    rows.push(figure_row(&choke, &hole.choke.figure));
    for figure in hole.conductance.iter().chain(&hole.diameter) {
        let reference = figure.reference.map(|r| format!(", {}", r.says())).unwrap_or_default();
        rows.push(figure_row(&format!("{}{reference}", figure.name), figure));
    }
    let caption = format!("{} of {} points are used.", line.used_of.0, line.used_of.1);
    table(Some(&caption), figure_columns(), rows, true)
}

fn points(of: &Calibration) -> Block {
    let any = of.points.first();
    let unit = |of: Option<&Figure>| of.map_or("", |figure| figure.unit.symbol()).to_owned();
    let columns = vec![
        Column::new("no", Align::Right),
        Column::numbers("p1, absolute", unit(any.map(|p| &p.pressure))),
        Column::numbers("± U", unit(any.map(|p| &p.pressure))),
        Column::numbers("flow", unit(any.map(|p| &p.flow))),
        Column::numbers("± U", unit(any.map(|p| &p.flow))),
        Column::numbers("residual", "%"),
        Column::new("sweep", Align::Left),
        Column::new("remark", Align::Left),
    ];
    let rows = of.points.iter().map(|point| {
        let row = PaperRow::new([
            point.number.to_string(),
            point.pressure.printed(),
            or_dash(point.pressure.printed_expanded()),
            point.flow.printed(),
            or_dash(point.flow.printed_expanded()),
            or_dash(point.residual.as_ref().map(Figure::printed)),
            point.sweep.unwrap_or("–").to_owned(),
            point.why_not.as_ref().map_or_else(String::new, |why| format!("not used: {why}")),
        ]);
        if point.why_not.is_some() { row.with(Emphasis::Quiet) } else { row }
    });
    let caption = format!("{}; U of the random part, k = 2.", Reference::Stpd.says());
    table(Some(&caption), columns, rows.collect(), true)
}

fn budget(of: &Calibration) -> Block {
    let columns = vec![
        Column::new("source", Align::Left),
        Column::numbers("u", of.budget.combined.u.unit.symbol()),
        Column::numbers("share", "%"),
        Column::new("degrees of freedom", Align::Right),
    ];
    let rows = of.budget.rows.iter().chain([&of.budget.combined]).enumerate().map(|(i, row)| {
        let dof = row.dof.as_ref().map_or_else(|| "infinite".to_owned(), Figure::printed);
        let cells = PaperRow::new([row.source.to_owned(), row.u.printed(), row.share.printed(), dof]);
        if i == of.budget.rows.len() { cells.with(Emphasis::Strong) } else { cells }
    });
    let caption = format!("Standard uncertainties of the flow at {} bar IP.", of.nominal.ip.printed());
    table(Some(&caption), columns, rows.collect(), true)
}

fn checks(of: &Calibration) -> Block {
    let columns = vec![
        Column::new("check", Align::Left),
        Column::new("finding", Align::Left),
        Column::new("value", Align::Right),
        Column::new("limit", Align::Right),
        Column::new("in words", Align::Left),
    ];
    let rows = of.checks.iter().map(|check| {
        let limits: Vec<String> = check.limits.iter().map(held_together).collect();
        let row = PaperRow::new([
            check.name.to_owned(),
            check.word.to_owned(),
            or_dash(check.value.as_ref().map(held_together)),
            if limits.is_empty() { "–".to_owned() } else { limits.join(" to ") },
            check.says.clone(),
        ]);
        if check.verdict == CheckVerdict::Fail { row.with(Emphasis::Strong) } else { row }
    });
    table(None, columns, rows.collect(), true)
}

/// A figure whose number and unit stay on one line.
fn held_together(figure: &Figure) -> String {
    figure.text().replace(' ', "\u{A0}")
}

/// A comparison as a table.
pub(super) fn comparison(of: &Comparison) -> Block {
    let rows = [&of.flow, &of.change, &of.en].map(|figure| figure_row(&figure.name, figure));
    table(None, figure_columns(), rows.to_vec(), true)
}

fn equipment(all: &[Equipment]) -> Block {
    let columns = vec![
        Column::new("instrument", Align::Left),
        Column::new("certificate", Align::Left),
        Column::new("in date until", Align::Left),
        Column::new("papers", Align::Left),
    ];
    let rows = all.iter().map(|one| {
        let id = one.id.as_ref().map(|id| format!(" {id}")).unwrap_or_default();
        let due = or_dash(one.due.map(|due| due.to_string()));
        let due = if one.in_date == Some(false) { format!("{due}, out of date") } else { due };
        let papers: Vec<String> = one.papers.iter().map(|(name, text)| format!("{name} {text}")).collect();
        PaperRow::new([format!("{}{id}", one.name), or_dash(one.certificate.clone()), due, papers.join("; ")])
    });
    table(None, columns, rows.collect(), true)
}

fn conditions(of: &Calibration) -> Block {
    let mut columns = figure_columns();
    columns.push(Column::new("known from", Align::Left));
    let rows = of.conditions.iter().map(|condition| {
        let mut row = figure_row(condition.name, &condition.figure);
        row.cells.push(condition.says.into());
        row
    });
    table(None, columns, rows.collect(), true)
}

/// The files inside, with their digests.
pub(super) fn files(files: &[File]) -> Block {
    let columns = vec![
        Column::new("file", Align::Left),
        Column::new("what it is", Align::Left),
        Column::new("SHA-256", Align::Left),
    ];
    let rows = files.iter().map(|file| PaperRow::new([file.name.as_str(), file.says, &file.sha256]));
    table(Some("Files inside this certificate."), columns, rows.collect(), true)
}
