//! Small dense matrices: what a handful of capacitors and amplifiers need.

use alloc::{vec, vec::Vec};

/// Rows one after the other.
#[derive(Clone, Debug, PartialEq)]
pub struct Matrix {
    /// How many columns.
    pub columns: usize,
    /// Row by row.
    pub values: Vec<f64>,
}

impl Matrix {
    /// All zero.
    pub fn zero(rows: usize, columns: usize) -> Self {
        Self { columns, values: vec![0.0; rows * columns] }
    }

    /// How many rows.
    pub fn rows(&self) -> usize {
        self.values.len().checked_div(self.columns).unwrap_or(0)
    }

    /// A row.
    pub fn row(&self, row: usize) -> &[f64] {
        &self.values[row * self.columns..(row + 1) * self.columns]
    }

    /// A row to write to.
    pub fn row_mut(&mut self, row: usize) -> &mut [f64] {
        &mut self.values[row * self.columns..(row + 1) * self.columns]
    }

    /// An entry.
    pub fn at(&mut self, row: usize, column: usize) -> &mut f64 {
        &mut self.values[row * self.columns + column]
    }

    /// The product with another one.
    pub fn times(&self, other: &Self) -> Self {
        let mut product = Self::zero(self.rows(), other.columns);
        for row in 0..self.rows() {
            for (inner, &factor) in self.row(row).iter().enumerate() {
                if factor.abs() > 0.0 {
                    add(product.row_mut(row), other.row(inner), factor);
                }
            }
        }
        product
    }

    /// Solves `self · X = right` by elimination with row scaling and partial pivoting; `right` becomes `X`. False when singular.
    #[must_use]
    pub fn solve(mut self, right: &mut Self) -> bool {
        let n = self.columns;
        for row in 0..n {
            let scale = self.row(row).iter().fold(0.0, |m: f64, v| m.max(v.abs()));
            if !(scale > 0.0 && scale < f64::INFINITY) {
                return false;
            }
            self.row_mut(row).iter_mut().for_each(|v| *v /= scale);
            right.row_mut(row).iter_mut().for_each(|v| *v /= scale);
        }
        for k in 0..n {
            let size = |row: usize| self.values[row * n + k].abs();
            let pivot = (k..n).fold(k, |best, row| if size(row) > size(best) { row } else { best });
            if size(pivot) <= 1e-300 {
                return false;
            }
            swap_rows(&mut self, k, pivot);
            swap_rows(right, k, pivot);
            for row in k + 1..n {
                let factor = self.values[row * n + k] / self.values[k * n + k];
                if factor.abs() > 0.0 {
                    subtract_row(&mut self, row, k, factor);
                    subtract_row(right, row, k, factor);
                }
            }
        }
        for k in (0..n).rev() {
            for column in k + 1..n {
                let factor = self.values[k * n + column];
                if factor.abs() > 0.0 {
                    subtract_row(right, k, column, factor);
                }
            }
            let pivot = self.values[k * n + k];
            right.row_mut(k).iter_mut().for_each(|v| *v /= pivot);
        }
        true
    }
}

fn swap_rows(matrix: &mut Matrix, a: usize, b: usize) {
    if a != b {
        for column in 0..matrix.columns {
            matrix.values.swap(a * matrix.columns + column, b * matrix.columns + column);
        }
    }
}

fn subtract_row(matrix: &mut Matrix, row: usize, other: usize, factor: f64) {
    for column in 0..matrix.columns {
        let step = factor * matrix.values[other * matrix.columns + column];
        matrix.values[row * matrix.columns + column] -= step;
    }
}

/// Adds `factor` times `other` to a row.
pub fn add(row: &mut [f64], other: &[f64], factor: f64) {
    for (r, o) in row.iter_mut().zip(other) {
        *r += factor * o;
    }
}

/// The product of two rows.
pub fn dot(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(x, y)| x * y).sum()
}
