pastern_bench(power_cut SOURCES power_cut.cpp LINKS pastern_faults CLI11::CLI11)
