pastern_bench(journal_damage SOURCES journal_damage.cpp LINKS pastern_faults CLI11::CLI11)
