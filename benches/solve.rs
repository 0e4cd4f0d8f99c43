//! Cost of a solve per fluid node: three shapes, four sizes. Growth is linear when the figures agree.
//!
//! `cargo bench --bench solve` prints for every case the time and, as throughput, fluid nodes per second.

use criterion::{BenchmarkId, Criterion, Throughput, criterion_group, criterion_main};
use etchwise::flow::{SolveOptions, solve_outline};
use etchwise::geometry::Outline;
use etchwise::grid::{Lattice, LineCrossings};
use etchwise::solve::{Hierarchy, SolveControl};

fn shapes() -> [(&'static str, Outline); 3] {
    let slanted = [[0.0, 0.0], [1.0, 0.2], [0.8, 1.2], [-0.2, 1.0]];
    let disc = (0..720).map(|k| {
        let t = f64::from(k).to_radians() / 2.0;
        [0.5 * t.cos(), 0.5 * t.sin()]
    });
    [
        ("slanted square", Outline::single(slanted.to_vec())),
        ("disc", Outline::single(disc.collect())),
        (
            "10 to 1 rectangle",
            Outline::single(vec![[0.0, 0.0], [10.0, 0.0], [10.0, 1.0], [0.0, 1.0]]),
        ),
    ]
}

fn bench(criterion: &mut Criterion) {
    let mut group = criterion.benchmark_group("solve");
    group.sample_size(10);
    for (name, outline) in shapes() {
        for cells in [64, 128, 256, 512] {
            let options = SolveOptions {
                cells_across: Some(f64::from(cells)),
                ..SolveOptions::default()
            };
            let Ok(solved) = solve_outline(&outline, &options) else {
                continue;
            };
            let grid = solved.flow.grid;
            group.throughput(Throughput::Elements(grid.fluid_nodes as u64));
            group.bench_function(BenchmarkId::new(name, cells), |bencher| {
                bencher.iter(|| {
                    let lattice = Lattice::new(&outline, grid.spacing, [0.0, 0.0]);
                    let rows = LineCrossings::rows(&lattice);
                    let columns = LineCrossings::columns(&lattice);
                    let mut hierarchy = Hierarchy::new(&lattice, &rows, &columns)?;
                    let control = SolveControl {
                        residual: 0.1 / f64::from(cells).powi(2),
                        most_cycles: 100,
                    };
                    hierarchy.solve(control, |_, _| {});
                    Some(hierarchy)
                });
            });
        }
    }
    group.finish();
}

criterion_group!(benches, bench);
criterion_main!(benches);
