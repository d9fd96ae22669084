//! A bracketed root (Chandrupatla, Advances in Engineering Software 28, 1997).

/// The root of `f` between `a` and `b`, where its values `fa` and `fb` differ in sign, to within `tolerance`;
/// returns the end of the last bracket on the side of `a`.
pub(super) fn bracketed(
    (mut a, mut fa): (f64, f64),
    (mut b, mut fb): (f64, f64),
    tolerance: f64,
    mut f: impl FnMut(f64) -> f64,
) -> f64 {
    const ITERATIONS: usize = 100;
    let holds = fa >= 0.0;
    // `a` is the newest point, `b` the one across the root, `c` the one before.
    let (mut c, mut fc);
    let mut t = 0.5;
    for _ in 0..ITERATIONS {
        let x = a + t * (b - a);
        let fx = f(x);
        if (fx >= 0.0) == (fa >= 0.0) {
            (c, fc) = (a, fa);
        } else {
            (c, fc, b, fb) = (b, fb, a, fa);
        }
        (a, fa) = (x, fx);
        let width = (b - a).abs();
        if width <= tolerance || fa == 0.0 {
            break;
        }
        let least = 0.5 * tolerance / width;
        let xi = (a - b) / (c - b);
        let phi = (fa - fb) / (fc - fb);
        t = if phi * phi < xi && (1.0 - phi) * (1.0 - phi) < 1.0 - xi {
            fa / (fb - fa) * fc / (fb - fc) + (c - a) / (b - a) * fa / (fc - fa) * fb / (fc - fb)
        } else {
            0.5
        }
        .clamp(least, 1.0 - least);
    }
    if (fa >= 0.0) == holds { a } else { b }
}
