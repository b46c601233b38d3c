//! Smooth tables over two coordinates.

#[cfg(target_arch = "x86_64")]
use std::arch::x86_64::{
    __m128d, _mm_add_pd, _mm_cvtsd_f64, _mm_mul_pd, _mm_set_pd, _mm_set1_pd, _mm_unpackhi_pd,
};

/// A bicubic Hermite table on a uniform grid: value and slopes are continuous across cells.
///
/// Built from value, slope over x, slope over y and cross slope at every grid point; kept as the sixteen
/// coefficients of each cell's bicubic, those of one power of y side by side. Outside its rectangle the
/// table goes on as a straight line.
#[derive(Clone, Debug)]
pub struct Table<const N: usize> {
    pub x: Axis,
    pub y: Axis,
    /// `[cell][quantity][power of y][power of x]` in cell units, y running fastest.
    cells: Vec<[[[f64; 4]; 4]; N]>,
}

/// A uniform axis of `cells` cells.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Axis {
    pub start: f64,
    pub cell: f64,
    pub cells: usize,
    per_cell: f64,
}

impl Axis {
    pub fn new(start: f64, end: f64, cells: usize) -> Axis {
        assert!(
            end > start && cells > 0,
            "an axis must run upward and have cells"
        );
        let cell = (end - start) / cells as f64;
        Axis {
            start,
            cell,
            cells,
            per_cell: 1.0 / cell,
        }
    }

    pub fn end(&self) -> f64 {
        self.start + self.cell * self.cells as f64
    }

    pub fn at(&self, k: usize) -> f64 {
        self.start + self.cell * k as f64
    }

    /// Cell, place in it (0 to 1), and how far outside the axis (in cells).
    #[inline(always)]
    fn locate(&self, value: f64) -> (usize, f64, f64) {
        let t = (value - self.start) * self.per_cell;
        let top = self.cells as f64;
        // Not-a-number falls to the lower edge and comes back through the distance outside.
        let inside = if t > 0.0 {
            if t < top { t } else { top }
        } else {
            0.0
        };
        // SAFETY: `inside` lies between 0 and the number of cells, which fits an i32.
        let mut k = unsafe { inside.to_int_unchecked::<i32>() } as usize;
        if k >= self.cells {
            k = self.cells - 1;
        }
        (k, inside - k as f64, t - inside)
    }
}

/// Value and slopes per unit of x and y.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Sample {
    pub f: f64,
    pub fx: f64,
    pub fy: f64,
}

/// A point of the table found once and used for several quantities.
#[derive(Clone, Copy, Debug, Default)]
pub struct Spot {
    cell: usize,
    tx: f64,
    ty: f64,
    /// Distances outside the rectangle, in cells.
    ox: f64,
    oy: f64,
}

/// The four coefficients of one power of y, in two pairs: what any x86-64 processor does at once.
///
/// Left to itself the compiler takes them one by one, which makes a render of one lane a tenth slower.
#[cfg(target_arch = "x86_64")]
#[derive(Clone, Copy)]
struct Row(__m128d, __m128d);

#[cfg(target_arch = "x86_64")]
impl Row {
    #[inline(always)]
    fn new(c: [f64; 4]) -> Row {
        // SAFETY: SSE2 is part of every x86-64 processor.
        unsafe { Row(_mm_set_pd(c[1], c[0]), _mm_set_pd(c[3], c[2])) }
    }

    /// This row plus `k` times the other.
    #[inline(always)]
    fn plus(self, other: Row, k: f64) -> Row {
        // SAFETY: as in `new`.
        unsafe {
            let k = _mm_set1_pd(k);
            Row(
                _mm_add_pd(self.0, _mm_mul_pd(k, other.0)),
                _mm_add_pd(self.1, _mm_mul_pd(k, other.1)),
            )
        }
    }

    /// First pair plus `k` times the second.
    #[inline(always)]
    fn fold(self, k: f64) -> [f64; 2] {
        // SAFETY: as in `new`.
        let sum = unsafe { _mm_add_pd(self.0, _mm_mul_pd(_mm_set1_pd(k), self.1)) };
        let [even, odd, ..] = Row(sum, sum).parts();
        [even, odd]
    }

    #[inline(always)]
    fn parts(self) -> [f64; 4] {
        // SAFETY: as in `new`.
        unsafe {
            [
                _mm_cvtsd_f64(self.0),
                _mm_cvtsd_f64(_mm_unpackhi_pd(self.0, self.0)),
                _mm_cvtsd_f64(self.1),
                _mm_cvtsd_f64(_mm_unpackhi_pd(self.1, self.1)),
            ]
        }
    }
}

/// The four coefficients of one power of y.
#[cfg(not(target_arch = "x86_64"))]
#[derive(Clone, Copy)]
struct Row([f64; 4]);

#[cfg(not(target_arch = "x86_64"))]
impl Row {
    #[inline(always)]
    fn new(c: [f64; 4]) -> Row {
        Row(c)
    }

    /// This row plus `k` times the other.
    #[inline(always)]
    fn plus(mut self, other: Row, k: f64) -> Row {
        for (a, b) in self.0.iter_mut().zip(other.0) {
            *a += k * b;
        }
        self
    }

    /// First pair plus `k` times the second.
    #[inline(always)]
    fn fold(self, k: f64) -> [f64; 2] {
        let [a, b, c, d] = self.0;
        [a + k * c, b + k * d]
    }

    #[inline(always)]
    fn parts(self) -> [f64; 4] {
        self.0
    }
}

/// Values and slopes at both ends of a unit interval to the coefficients of the cubic through them.
fn cubic([f0, f1, d0, d1]: [f64; 4]) -> [f64; 4] {
    [
        f0,
        d0,
        3.0 * (f1 - f0) - 2.0 * d0 - d1,
        2.0 * (f0 - f1) + d0 + d1,
    ]
}

impl<const N: usize> Table<N> {
    /// Builds the table from `[f, f_x, f_y, f_xy]` (per unit) at every grid point, y running fastest.
    pub fn new(x: Axis, y: Axis, points: &[[[f64; 4]; N]]) -> Table<N> {
        assert_eq!(
            points.len(),
            (x.cells + 1) * (y.cells + 1),
            "one entry per grid point"
        );
        let stride = y.cells + 1;
        let mut cells = Vec::with_capacity(x.cells * y.cells);
        for kx in 0..x.cells {
            for ky in 0..y.cells {
                let corner = kx * stride + ky;
                let (p00, p01) = (&points[corner], &points[corner + 1]);
                let (p10, p11) = (&points[corner + stride], &points[corner + stride + 1]);
                cells.push(std::array::from_fn(|q| {
                    let (a, b, c, d) = (&p00[q], &p01[q], &p10[q], &p11[q]);
                    // Along x first: coefficients of value and of y slope at either end of y.
                    let value_low = cubic([a[0], c[0], a[1] * x.cell, c[1] * x.cell]);
                    let value_high = cubic([b[0], d[0], b[1] * x.cell, d[1] * x.cell]);
                    let slope_low = cubic([a[2], c[2], a[3] * x.cell, c[3] * x.cell]);
                    let slope_high = cubic([b[2], d[2], b[3] * x.cell, d[3] * x.cell]);
                    let by_x: [[f64; 4]; 4] = std::array::from_fn(|i| {
                        cubic([
                            value_low[i],
                            value_high[i],
                            slope_low[i] * y.cell,
                            slope_high[i] * y.cell,
                        ])
                    });
                    std::array::from_fn(|j| std::array::from_fn(|i| by_x[i][j]))
                }));
            }
        }
        Table { x, y, cells }
    }

    /// Whether (x, y) lies inside the rectangle.
    #[inline]
    pub fn covers(&self, x: f64, y: f64) -> bool {
        x >= self.x.start && x <= self.x.end() && y >= self.y.start && y <= self.y.end()
    }

    #[inline(always)]
    pub fn spot(&self, x: f64, y: f64) -> Spot {
        let (kx, tx, ox) = self.x.locate(x);
        let (ky, ty, oy) = self.y.locate(y);
        Spot {
            cell: kx * self.y.cells + ky,
            tx,
            ty,
            ox,
            oy,
        }
    }

    #[inline(always)]
    fn coefficients(&self, s: &Spot, quantity: usize) -> &[[f64; 4]; 4] {
        debug_assert!(s.cell < self.cells.len());
        // SAFETY: `spot` yields existing cells only, and a table never changes size.
        unsafe { &self.cells.get_unchecked(s.cell)[quantity] }
    }

    /// Value and both slopes of one quantity.
    #[inline(always)]
    pub fn sample(&self, s: &Spot, quantity: usize) -> Sample {
        let [c0, c1, c2, c3] = self.coefficients(s, quantity).map(Row::new);
        let (x, y) = (s.tx, s.ty);
        let (x2, y2) = (x * x, y * y);
        let r = c0.plus(c1, y).plus(c2.plus(c3, y), y2);
        let d = c1.plus(c2, 2.0 * y).plus(c3, 3.0 * y2);
        // Even and odd powers of x, of the value beside the slope over y.
        let ([f_even, f_odd], [fy_even, fy_odd]) = (r.fold(x2), d.fold(x2));
        let mut f = f_even + x * f_odd;
        let fy = fy_even + x * fy_odd;
        let [_, r1, r2, r3] = r.parts();
        let fx = (r1 + 2.0 * x * r2) + 3.0 * x2 * r3;
        if s.ox != 0.0 || s.oy != 0.0 {
            f += s.ox * fx + s.oy * fy;
        }
        Sample {
            f,
            fx: fx * self.x.per_cell,
            fy: fy * self.y.per_cell,
        }
    }

    /// Value of one quantity.
    #[inline(always)]
    pub fn value(&self, s: &Spot, quantity: usize) -> f64 {
        if s.ox != 0.0 || s.oy != 0.0 {
            return self.sample(s, quantity).f;
        }
        let [c0, c1, c2, c3] = self.coefficients(s, quantity).map(Row::new);
        let (x, y) = (s.tx, s.ty);
        let r = c0.plus(c1, y).plus(c2.plus(c3, y), y * y);
        let [even, odd] = r.fold(x * x);
        even + x * odd
    }
}

/// Slope of equally spaced samples at index `k`: fourth-order central inside, lower order at the ends.
pub fn difference(samples: impl Fn(usize) -> f64, k: usize, count: usize, spacing: f64) -> f64 {
    let last = count - 1;
    let raw = if k >= 2 && k + 2 <= last {
        (8.0 * (samples(k + 1) - samples(k - 1)) - (samples(k + 2) - samples(k - 2))) / 12.0
    } else if k >= 1 && k < last {
        (samples(k + 1) - samples(k - 1)) / 2.0
    } else if last == 0 {
        0.0
    } else if k == 0 {
        if last >= 2 {
            -1.5 * samples(0) + 2.0 * samples(1) - 0.5 * samples(2)
        } else {
            samples(1) - samples(0)
        }
    } else if last >= 2 {
        1.5 * samples(last) - 2.0 * samples(last - 1) + 0.5 * samples(last - 2)
    } else {
        samples(last) - samples(last - 1)
    };
    raw / spacing
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A bicubic polynomial is reproduced exactly, inside, and its slopes with it.
    #[test]
    fn a_bicubic_is_its_own_table() {
        let f = |x: f64, y: f64| {
            1.0 + 0.3 * x - 0.2 * y + 0.5 * x * x * y - 0.1 * x.powi(3) * y.powi(3)
        };
        let fx = |x: f64, y: f64| 0.3 + x * y - 0.3 * x * x * y.powi(3);
        let fy = |x: f64, y: f64| -0.2 + 0.5 * x * x - 0.3 * x.powi(3) * y * y;
        let fxy = |x: f64, y: f64| x - 0.9 * x * x * y * y;
        let (ax, ay) = (Axis::new(-1.0, 2.0, 5), Axis::new(0.0, 3.0, 4));
        let mut points = Vec::new();
        for i in 0..=5 {
            for j in 0..=4 {
                let (x, y) = (ax.at(i), ay.at(j));
                points.push([[f(x, y), fx(x, y), fy(x, y), fxy(x, y)]]);
            }
        }
        let table = Table::new(ax, ay, &points);
        for (x, y) in [(0.1, 0.2), (-1.0, 3.0), (2.0, 0.0), (1.37, 2.9)] {
            let spot = table.spot(x, y);
            let s = table.sample(&spot, 0);
            assert!((s.f - f(x, y)).abs() < 1e-12);
            assert!((s.fx - fx(x, y)).abs() < 1e-11);
            assert!((s.fy - fy(x, y)).abs() < 1e-11);
            assert!((table.value(&spot, 0) - f(x, y)).abs() < 1e-12);
        }
        let edge = table.sample(&table.spot(2.0, 1.0), 0);
        let beyond = table.sample(&table.spot(2.5, 1.0), 0);
        assert!((beyond.f - edge.f - 0.5 * edge.fx).abs() < 1e-12);
    }
}
