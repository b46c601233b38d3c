//! Root of a function of one variable between two points of opposite sign.

use thiserror::Error;

/// Steps after which a search is given up. Brent's bound for doubles is about 53² in the worst
/// case; functions met in practice take ten. Chosen.
const STEPS: usize = 500;

/// Why no root was found.
#[derive(Clone, Copy, Debug, PartialEq, Error)]
pub enum RootError {
    #[error("f({a:e}) = {f_a:e} and f({b:e}) = {f_b:e} have the same sign")]
    NotBracketed { a: f64, f_a: f64, b: f64, f_b: f64 },
    #[error("f({x:e}) is not a finite number")]
    NotFinite { x: f64 },
    #[error("no root to the tolerance after {steps} steps; the last point was {x:e}")]
    NotConverged { steps: usize, x: f64 },
}

/// Root of `f` between `a` and `b`, where it has opposite signs.
///
/// Inverse quadratic interpolation and secant steps, with bisection whenever they gain too little.
/// A continuous function has a root there; of several, one is found. A jump through zero is found
/// like a root. The result is within `tolerance` (absolute, in x; zero is allowed) plus four units
/// in the last place of a change of sign.
///
/// Source: R. P. Brent, Algorithms for Minimization without Derivatives, 1973, chapter 4.
///
/// # Errors
/// [`RootError`].
///
/// ```
/// use forehear::numeric::root::bracketed_root;
///
/// let golden = bracketed_root(|x| x * x - x - 1.0, 1.0, 2.0, 0.0)?;
/// assert!((golden - (1.0 + 5f64.sqrt()) / 2.0).abs() < 1e-15);
/// # Ok::<(), forehear::numeric::root::RootError>(())
/// ```
pub fn bracketed_root(
    mut f: impl FnMut(f64) -> f64,
    a: f64,
    b: f64,
    tolerance: f64,
) -> Result<f64, RootError> {
    let mut finite = |x: f64| {
        let y = f(x);
        if x.is_finite() && y.is_finite() {
            Ok(y)
        } else {
            Err(RootError::NotFinite { x })
        }
    };
    // b is the best point, c the point across the root, a the best point before.
    let (mut a, mut b) = (a, b);
    let (mut f_a, mut f_b) = (finite(a)?, finite(b)?);
    if f_a != 0.0 && f_b != 0.0 && (f_a > 0.0) == (f_b > 0.0) {
        return Err(RootError::NotBracketed { a, f_a, b, f_b });
    }
    let (mut c, mut f_c) = (a, f_a);
    let mut step = b - a;
    let mut step_before = step;
    for _ in 0..STEPS {
        if f_c.abs() < f_b.abs() {
            (a, b, c) = (b, c, b);
            (f_a, f_b, f_c) = (f_b, f_c, f_b);
        }
        let close = 2.0 * f64::EPSILON * b.abs() + 0.5 * tolerance;
        let half = 0.5 * (c - b);
        if half.abs() <= close || f_b == 0.0 {
            return Ok(b);
        }
        match interpolated((a, f_a), (b, f_b), (c, f_c)) {
            Some(try_step)
                if step_before.abs() >= close
                    && f_a.abs() > f_b.abs()
                    && 2.0 * (try_step / half) < 3.0 - (close / half).abs()
                    && try_step.abs() < 0.5 * step_before.abs()
                    && try_step / half > 0.0 =>
            {
                step_before = step;
                step = try_step;
            }
            _ => {
                step = half;
                step_before = half;
            }
        }
        (a, f_a) = (b, f_b);
        b += if step.abs() > close {
            step
        } else {
            close.copysign(half)
        };
        f_b = finite(b)?;
        if (f_b > 0.0) == (f_c > 0.0) {
            (c, f_c) = (a, f_a);
            step = b - a;
            step_before = step;
        }
    }
    Err(RootError::NotConverged { steps: STEPS, x: b })
}

/// Step from b to the root of the parabola x(y) through three points, or of the secant through two.
fn interpolated(a: (f64, f64), b: (f64, f64), c: (f64, f64)) -> Option<f64> {
    let s = b.1 / a.1;
    let (p, q) = if a.0 == c.0 {
        (s * (c.0 - b.0), s - 1.0)
    } else {
        let q = a.1 / c.1;
        let r = b.1 / c.1;
        (
            s * ((c.0 - b.0) * q * (q - r) - (b.0 - a.0) * (r - 1.0)),
            -(q - 1.0) * (r - 1.0) * (s - 1.0),
        )
    };
    let step = p / q;
    step.is_finite().then_some(step)
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    proptest! {
        #[test]
        fn cube_root_is_found_from_any_bracket(
            root in -50.0..50.0f64,
            below in 1e-3..1e3f64,
            above in 1e-3..1e3f64,
        ) {
            let found = bracketed_root(|x| (x - root).powi(3), root - below, root + above, 1e-9);
            prop_assert!((found.unwrap() - root).abs() < 2e-9);
        }

        #[test]
        fn root_of_a_line_does_not_depend_on_the_order_of_its_ends(root in -1.0..1.0f64) {
            let there = bracketed_root(|x| x - root, -2.0, 3.0, 0.0).unwrap();
            let back = bracketed_root(|x| root - x, 3.0, -2.0, 0.0).unwrap();
            prop_assert!((there - root).abs() < 1e-15);
            prop_assert!((back - root).abs() < 1e-15);
        }
    }

    #[test]
    fn cosine_meets_the_diagonal_where_the_books_say() {
        // The fixed point of the cosine, OEIS A003957.
        let found = bracketed_root(|x| x.cos() - x, 0.0, 1.0, 0.0).unwrap();
        assert!((found - 0.739_085_133_215_160_6).abs() < 1e-15);
    }

    #[test]
    fn smooth_function_takes_few_steps_and_a_jump_no_more_than_bisection_squared() {
        let mut calls = 0;
        let mut count = |y: f64| {
            calls += 1;
            y
        };
        bracketed_root(|x| count(x.exp() - 20.0), 0.0, 10.0, 0.0).unwrap();
        assert!(calls < 20, "{calls} evaluations");
        let jump = bracketed_root(|x| if x < 0.3 { -1.0 } else { 1e9 }, 0.0, 1.0, 1e-12).unwrap();
        assert!((jump - 0.3).abs() < 1e-12);
    }

    #[test]
    fn root_at_an_end_is_taken() {
        assert_eq!(bracketed_root(|x| x, 0.0, 1.0, 0.0), Ok(0.0));
        assert_eq!(bracketed_root(|x| x - 1.0, 0.0, 1.0, 0.0), Ok(1.0));
    }

    #[test]
    fn same_signs_and_broken_functions_are_refused() {
        let same = bracketed_root(|x| x * x + 1.0, -1.0, 1.0, 0.0);
        assert!(matches!(same, Err(RootError::NotBracketed { .. })));
        let broken = bracketed_root(|x| (x - 0.5).sqrt(), 0.0, 1.0, 0.0);
        assert_eq!(broken, Err(RootError::NotFinite { x: 0.0 }));
    }
}
