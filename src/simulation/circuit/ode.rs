//! Steps of the embedded pair of orders 5 and 4 of Dormand and Prince.
//!
//! Dormand and Prince 1980, J. Comput. Appl. Math. 6(1):19-26 (coefficients as in Hairer, Norsett and Wanner, Solving Ordinary
//! Differential Equations I, table II.5.2; from memory, checked by the order conditions and by the tests of the circuits).

/// Nodes of the stages below the diagonal, and the weights of order 5 as the last row.
const A: [[f64; 6]; 6] = [
    [1.0 / 5.0, 0.0, 0.0, 0.0, 0.0, 0.0],
    [3.0 / 40.0, 9.0 / 40.0, 0.0, 0.0, 0.0, 0.0],
    [44.0 / 45.0, -56.0 / 15.0, 32.0 / 9.0, 0.0, 0.0, 0.0],
    [19372.0 / 6561.0, -25360.0 / 2187.0, 64448.0 / 6561.0, -212.0 / 729.0, 0.0, 0.0],
    [9017.0 / 3168.0, -355.0 / 33.0, 46732.0 / 5247.0, 49.0 / 176.0, -5103.0 / 18656.0, 0.0],
    [35.0 / 384.0, 0.0, 500.0 / 1113.0, 125.0 / 192.0, -2187.0 / 6784.0, 11.0 / 84.0],
];

/// Weights of order 5 less those of order 4.
const E: [f64; 7] =
    [71.0 / 57600.0, 0.0, -71.0 / 16695.0, 71.0 / 1920.0, -17253.0 / 339_200.0, 22.0 / 525.0, -1.0 / 40.0];

/// One step of length `h` of the autonomous system `rate`: the values after it, and the estimate of their error.
pub(super) fn step<const N: usize>(
    y: &[f64; N],
    h: f64,
    rate: impl Fn(&[f64; N]) -> [f64; N],
) -> ([f64; N], [f64; N]) {
    let mut stages = [[0.0; N]; 7];
    stages[0] = rate(y);
    let mut at = *y;
    for (row, weights) in A.iter().enumerate() {
        for j in 0..N {
            let mut sum = 0.0;
            for (weight, stage) in weights.iter().zip(&stages).take(row + 1) {
                sum += weight * stage[j];
            }
            at[j] = y[j] + h * sum;
        }
        stages[row + 1] = rate(&at);
    }
    let mut error = [0.0; N];
    for j in 0..N {
        for (weight, stage) in E.iter().zip(&stages) {
            error[j] += weight * stage[j];
        }
        error[j] *= h;
    }
    (at, error)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn halving_the_step_divides_the_error_by_about_thirty_two() {
        // y' = -y^2 from 1: y = 1 / (1 + t), a published test equation with a closed form.
        let error = |steps: u32| {
            let h = 1.0 / f64::from(steps);
            let mut y = [1.0];
            for _ in 0..steps {
                y = step(&y, h, |y| [-y[0] * y[0]]).0;
            }
            (y[0] - 0.5).abs()
        };
        let order = libm::log2(error(16) / error(32));
        assert!((4.5..6.5).contains(&order), "order {order}");
        assert!(error(16) < 1e-8);
    }

    #[test]
    fn the_estimate_is_of_the_errors_size() {
        let (y, estimate) = step(&[1.0], 0.1, |y| [-y[0] * y[0]]);
        let error = (y[0] - 1.0 / 1.1).abs();
        assert!(estimate[0].abs() > 0.1 * error && estimate[0].abs() < 1e-5, "{error} {}", estimate[0]);
    }
}
