pastern_bench(dry_runs SOURCES dry_runs.cpp LINKS pastern_session CLI11::CLI11 Threads::Threads)
add_dependencies(bench_dry_runs pastern_hal_stub_plugin)
