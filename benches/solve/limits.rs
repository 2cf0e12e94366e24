//! What this core can do at most, to hold the engine's time against.

use std::hint::black_box;
use std::time::Instant;

/// Multiply-adds of one node and iteration: two complex 4 x 4 products halved by structure, and the load.
const FLOPS_A_NODE: f64 = 128.0 + 32.0 + 90.0;
/// Bytes a node and iteration out of cache: voltages, currents, drops read and written, load and branch records read.
const BYTES_A_NODE: f64 = 64.0 * 6.0 + 32.0 + 128.0 + 12.0;

/// Prints the share of this core's limits that the two times, in cache and out of it, reach.
pub fn report(cached_ns: f64, memory_ns: f64) {
    let (flops, bandwidth) = (gigaflops(), gigabytes_a_second());
    println!(
        "\nThis core: {flops:.0} GFLOP/s of multiply-add in plain code, {bandwidth:.0} GB/s from memory (triad).\n\
         Engine: {:.0} GFLOP/s in cache (1 000 nodes), {:.0} GB/s of traffic at 100 000 nodes (part of it still in a shared cache), counting {FLOPS_A_NODE} flops and {BYTES_A_NODE} bytes a node.",
        FLOPS_A_NODE / cached_ns,
        BYTES_A_NODE / memory_ns,
    );
}

/// Multiply-adds of independent numbers in registers.
fn gigaflops() -> f64 {
    #[cfg(target_arch = "x86_64")]
    {
        if std::arch::is_x86_feature_detected!("avx2") && std::arch::is_x86_feature_detected!("fma") {
            #[target_feature(enable = "avx2,fma")]
            fn wide() -> f64 {
                multiply_adds()
            }
            #[allow(unsafe_code)] // the features were found just above
            return unsafe { wide() };
        }
    }
    multiply_adds()
}

#[inline(always)]
fn multiply_adds() -> f64 {
    const LANES: usize = 48;
    const ROUNDS: usize = 200_000;
    let mut best = f64::INFINITY;
    for _ in 0..10 {
        let mut sums = black_box([1.0f64; LANES]);
        let (factor, add) = (black_box(0.999_999), black_box(1e-6));
        let start = Instant::now();
        for _ in 0..ROUNDS {
            for s in &mut sums {
                *s = s.mul_add(factor, add);
            }
        }
        best = best.min(start.elapsed().as_secs_f64());
        black_box(sums);
    }
    2.0 * (LANES * ROUNDS) as f64 / best / 1e9
}

/// `a = b + s c` over arrays far beyond the cache.
fn gigabytes_a_second() -> f64 {
    const LENGTH: usize = 8 << 20;
    let (b, c) = (vec![1.0f64; LENGTH], vec![2.0f64; LENGTH]);
    let mut a = vec![0.0f64; LENGTH];
    let mut best = f64::INFINITY;
    for _ in 0..5 {
        let start = Instant::now();
        for i in 0..LENGTH {
            a[i] = b[i] + 3.0 * c[i];
        }
        best = best.min(start.elapsed().as_secs_f64());
        black_box(&a);
    }
    (3 * 8 * LENGTH) as f64 / best / 1e9
}
