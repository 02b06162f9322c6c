//! Every number of a content as it is printed, by its path.

use super::figure::Figure;
use super::{Calibration, Comparison, Content, Row};

/// One printed number.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Printed {
    /// Path of the figure.
    pub path: String,
    /// What it is.
    pub name: String,
    /// The value.
    pub value: String,
    /// Its expanded uncertainty.
    pub expanded: Option<String>,
    /// Its coverage factor.
    pub k: Option<String>,
    /// Its coverage probability.
    pub p: Option<String>,
}

/// Every number of a content, in the order of its sections.
#[must_use]
pub fn printed(content: &Content) -> Vec<Printed> {
    content.figures().into_iter().map(Printed::of).collect()
}

impl Printed {
    fn of(figure: &Figure) -> Self {
        Self {
            path: figure.path.clone(),
            name: figure.name.clone(),
            value: figure.printed(),
            expanded: figure.printed_expanded(),
            k: figure.printed_k(),
            p: figure.printed_p(),
        }
    }
}

impl Content {
    /// Every figure, in the order of the sections.
    #[must_use]
    pub fn figures(&self) -> Vec<&Figure> {
        let mut all = Vec::new();
        for calibration in self.calibrations() {
            of_calibration(calibration, &mut all);
        }
        all.extend(self.changed_by_work.iter().flat_map(of_comparison));
        all
    }
}

fn of_calibration<'c>(of: &'c Calibration, all: &mut Vec<&'c Figure>) {
    all.extend(of_row(&of.nominal));
    if let Some(conformity) = &of.conformity {
        all.extend([&conformity.judged, &conformity.nominal]);
        all.extend(&conformity.limits);
        all.extend(conformity.guarded.iter().flatten());
    }
    all.extend([&of.line.intercept, &of.line.slope]);
    all.extend(&of.line.covariance);
    all.extend(&of.line.span);
    all.extend(&of.line.reduced_chi_square);
    all.push(&of.hole.choke.figure);
    all.extend(of.hole.conductance.iter().chain(&of.hole.diameter));
    for point in &of.points {
        all.extend([&point.pressure, &point.flow]);
        all.extend(&point.residual);
    }
    all.extend(of.table.iter().flat_map(of_row));
    for row in of.budget.rows.iter().chain([&of.budget.combined]) {
        all.extend([&row.u, &row.share]);
        all.extend(&row.dof);
    }
    for check in &of.checks {
        all.extend(check.value.iter().chain(&check.limits));
    }
    all.extend(of.before.iter().flat_map(of_comparison));
    all.extend(of.conditions.iter().map(|condition| &condition.figure));
}

fn of_row(row: &Row) -> impl Iterator<Item = &Figure> {
    [&row.ip, &row.flow].into_iter().chain(&row.as_oxygen)
}

fn of_comparison(comparison: &Comparison) -> [&Figure; 3] {
    [&comparison.flow, &comparison.change, &comparison.en]
}
