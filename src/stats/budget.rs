//! Uncertainty budget: what each source contributes, and what they come to together.
//!
//! Takes rows (name, contribution, degrees of freedom), sources independent of one another, and returns the combined
//! standard uncertainty (JCGM 100:2008, 5.1.2), effective degrees of freedom (G.4.1), coverage factor and expanded
//! uncertainty (clause 6). Left out: correlated rows; give what is common as one row.

use super::coverage::{coverage_factor, welch_satterthwaite};

/// One source of uncertainty.
#[derive(Debug, Clone, PartialEq)]
pub struct BudgetRow {
    /// What the uncertainty comes from, in the reader's words.
    pub source: String,
    /// Sensitivity times standard uncertainty, in the unit of the result; the sign says which way the source pushes.
    pub contribution: f64,
    /// Degrees of freedom of the standard uncertainty, above zero; infinite when it is taken as known.
    pub dof: f64,
}

impl BudgetRow {
    /// A row from a source's sensitivity coefficient, its standard uncertainty and its degrees of freedom.
    pub fn new(source: impl Into<String>, sensitivity: f64, u: f64, dof: f64) -> Self {
        Self { source: source.into(), contribution: sensitivity * u, dof }
    }
}

/// All sources of uncertainty of one result.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Budget {
    /// The rows, in the order they are printed.
    pub rows: Vec<BudgetRow>,
}

impl Budget {
    /// A budget of these rows.
    pub fn new(rows: Vec<BudgetRow>) -> Self {
        Self { rows }
    }

    /// Adds a row at the end.
    pub fn push(&mut self, row: BudgetRow) {
        self.rows.push(row);
    }

    /// Combined standard uncertainty: root sum of squares of the contributions.
    pub fn combined_u(&self) -> f64 {
        self.rows.iter().map(|r| r.contribution * r.contribution).sum::<f64>().sqrt()
    }

    /// Effective degrees of freedom; infinite when no row limits them.
    pub fn effective_dof(&self) -> f64 {
        welch_satterthwaite(self.rows.iter().map(|r| (r.contribution, r.dof)))
    }

    /// Coverage factor for `probability` (0.95 for 95 %).
    pub fn coverage_factor(&self, probability: f64) -> f64 {
        coverage_factor(probability, self.effective_dof())
    }

    /// Expanded uncertainty for `probability`: coverage factor times combined standard uncertainty.
    pub fn expanded(&self, probability: f64) -> f64 {
        self.coverage_factor(probability) * self.combined_u()
    }

    /// Share of the combined variance that each row holds, in the order of the rows, together 1; all zero when there is no
    /// uncertainty.
    pub fn shares(&self) -> Vec<f64> {
        let whole: f64 = self.rows.iter().map(|r| r.contribution * r.contribution).sum();
        let share = |r: &BudgetRow| if whole > 0.0 { r.contribution * r.contribution / whole } else { 0.0 };
        self.rows.iter().map(share).collect()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn rows_combine_by_squares_and_the_shares_make_a_whole() {
        let mut budget = Budget::new(vec![BudgetRow::new("gain", -3.0, 1.0, f64::INFINITY)]);
        budget.push(BudgetRow::new("scatter", 1.0, 4.0, 9.0));
        assert!((budget.combined_u() - 5.0).abs() < 1e-15);
        assert!((budget.effective_dof() - 625.0 / (256.0 / 9.0)).abs() < 1e-12);
        assert!((budget.shares()[0] - 0.36).abs() < 1e-15 && (budget.shares()[1] - 0.64).abs() < 1e-15);
        assert!((budget.expanded(0.95) / budget.combined_u() - budget.coverage_factor(0.95)).abs() < 1e-15);
    }

    #[test]
    fn no_rows_are_no_uncertainty() {
        let none = Budget::default();
        assert!(
            none.combined_u().abs() < 1e-300
                && none.expanded(0.95).abs() < 1e-300
                && none.shares().is_empty()
        );
    }
}
