//! Smooth tables over two coordinates.

/// A bicubic Hermite table on a uniform grid: value and slopes are continuous across cells.
///
/// Each grid point holds, for each of `N` quantities, value, slope over x, slope over y and cross slope,
/// scaled to cell units. Outside its rectangle the table goes on as a straight line.
#[derive(Clone, Debug)]
pub struct Table<const N: usize> {
    pub x: Axis,
    pub y: Axis,
    /// `[point][quantity] = [f, f_x, f_y, f_xy]`, y running fastest.
    points: Vec<[[f64; 4]; N]>,
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
#[derive(Clone, Copy, Debug)]
pub struct Spot {
    corner: usize,
    bx: [f64; 4],
    by: [f64; 4],
    ox: f64,
    oy: f64,
    tx: f64,
    ty: f64,
}

#[inline(always)]
fn basis(t: f64) -> [f64; 4] {
    let t2 = t * t;
    let t3 = t2 * t;
    let h1 = 3.0 * t2 - 2.0 * t3;
    [1.0 - h1, h1, t3 - 2.0 * t2 + t, t3 - t2]
}

#[inline(always)]
fn basis_slope(t: f64) -> [f64; 4] {
    let t2 = t * t;
    let d = 6.0 * (t - t2);
    [-d, d, 3.0 * t2 - 4.0 * t + 1.0, 3.0 * t2 - 2.0 * t]
}

impl<const N: usize> Table<N> {
    /// Builds the table from `[f, f_x, f_y, f_xy]` (per unit) at every grid point, y running fastest.
    pub fn new(x: Axis, y: Axis, mut points: Vec<[[f64; 4]; N]>) -> Table<N> {
        assert_eq!(
            points.len(),
            (x.cells + 1) * (y.cells + 1),
            "one entry per grid point"
        );
        for p in &mut points {
            for q in p {
                q[1] *= x.cell;
                q[2] *= y.cell;
                q[3] *= x.cell * y.cell;
            }
        }
        Table { x, y, points }
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
            corner: kx * (self.y.cells + 1) + ky,
            bx: basis(tx),
            by: basis(ty),
            ox,
            oy,
            tx,
            ty,
        }
    }

    #[inline(always)]
    fn corners(&self, s: &Spot, quantity: usize) -> [&[f64; 4]; 4] {
        let stride = self.y.cells + 1;
        debug_assert!(s.corner + stride + 1 < self.points.len());
        // SAFETY: `spot` yields corners of existing cells only, and the table never changes size.
        unsafe {
            [
                &self.points.get_unchecked(s.corner)[quantity],
                &self.points.get_unchecked(s.corner + 1)[quantity],
                &self.points.get_unchecked(s.corner + stride)[quantity],
                &self.points.get_unchecked(s.corner + stride + 1)[quantity],
            ]
        }
    }

    /// Value and both slopes of one quantity.
    #[inline(always)]
    pub fn sample(&self, s: &Spot, quantity: usize) -> Sample {
        let [p00, p01, p10, p11] = self.corners(s, quantity);
        let dy = basis_slope(s.ty);
        let dx = basis_slope(s.tx);
        // Along y first: value and x slope at either x end, then their y slopes.
        let along = |a: &[f64; 4], b: &[f64; 4], w: &[f64; 4], k: usize| {
            (w[0] * a[k] + w[1] * b[k]) + (w[2] * a[k + 2] + w[3] * b[k + 2])
        };
        let f0 = along(p00, p01, &s.by, 0);
        let f1 = along(p10, p11, &s.by, 0);
        let g0 = along(p00, p01, &s.by, 1);
        let g1 = along(p10, p11, &s.by, 1);
        let f0y = along(p00, p01, &dy, 0);
        let f1y = along(p10, p11, &dy, 0);
        let g0y = along(p00, p01, &dy, 1);
        let g1y = along(p10, p11, &dy, 1);
        let across = |w: &[f64; 4], a: f64, b: f64, c: f64, d: f64| {
            (w[0] * a + w[1] * b) + (w[2] * c + w[3] * d)
        };
        let mut f = across(&s.bx, f0, f1, g0, g1);
        let fx = across(&dx, f0, f1, g0, g1);
        let fy = across(&s.bx, f0y, f1y, g0y, g1y);
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
        let [p00, p01, p10, p11] = self.corners(s, quantity);
        let along = |a: &[f64; 4], b: &[f64; 4], k: usize| {
            (s.by[0] * a[k] + s.by[1] * b[k]) + (s.by[2] * a[k + 2] + s.by[3] * b[k + 2])
        };
        (s.bx[0] * along(p00, p01, 0) + s.bx[1] * along(p10, p11, 0))
            + (s.bx[2] * along(p00, p01, 1) + s.bx[3] * along(p10, p11, 1))
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
        let table = Table::new(ax, ay, points);
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
