//! Every linear network's step, in all lanes at once, as rows of nonzero coefficients.

/// Rows of a sparse matrix, lane beside lane, multiplied with one vector of quantities.
#[derive(Clone, Debug)]
pub struct Rows<const L: usize> {
    /// First coefficient of each row, and one past the last.
    starts: Vec<u32>,
    sources: Vec<u32>,
    coefficients: Vec<[f64; L]>,
}

impl<const L: usize> Rows<L> {
    pub fn new() -> Self {
        Rows {
            starts: vec![0],
            sources: Vec::new(),
            coefficients: Vec::new(),
        }
    }

    /// Adds a row from `(source, coefficient)` pairs; all-zero coefficients are left out.
    pub fn push(&mut self, row: impl IntoIterator<Item = (usize, [f64; L])>) {
        for (source, c) in row {
            if c.iter().any(|c| *c != 0.0) {
                self.sources.push(source as u32);
                self.coefficients.push(c);
            }
        }
        self.starts.push(self.sources.len() as u32);
    }

    pub fn len(&self) -> usize {
        self.starts.len() - 1
    }

    /// Writes each row's product with `q` into `out`.
    #[inline(always)]
    pub fn multiply(&self, q: &[[f64; L]], out: &mut [[f64; L]]) {
        let mut k = 0usize;
        for (row, slot) in out.iter_mut().enumerate().take(self.len()) {
            let end = self.starts[row + 1] as usize;
            let mut sum = [0.0; L];
            while k < end {
                let c = &self.coefficients[k];
                let x = &q[self.sources[k] as usize];
                for l in 0..L {
                    sum[l] += c[l] * x[l];
                }
                k += 1;
            }
            *slot = sum;
        }
    }
}
