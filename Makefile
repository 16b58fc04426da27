# tomogauge: `make help` lists the targets.  V=release|asan|cov chooses the build; your own CFLAGS and LDFLAGS come last.
V ?= release
B := build/$(V)
PYTHON ?= /usr/bin/python3
PREFIX ?= /usr/local
T ?= 60

PKGS := cfitsio libpng gsl yaml-0.1 jansson popt fftw3 fftw3f libxrl zlib
LIBS_ := $(shell pkg-config --libs $(PKGS)) -lm
CPP_ := -I. -D_XOPEN_SOURCE=700 $(shell pkg-config --cflags $(PKGS))
WARN := -Wall -Wextra -Wshadow -Wconversion -Wcast-qual -Wmissing-prototypes -Wstrict-prototypes -Wvla -Wdouble-promotion \
        -Wformat=2 -Wundef -Wpointer-arith -Wwrite-strings -Wcast-align -Wnull-dereference
# clang takes NAN and INFINITY themselves for promoted floats; gcc does not, and checks the rest
WARN += $(if $(findstring clang,$(CC)),-Wno-double-promotion)
FLAGS_release := -O3 -g -fno-math-errno -fno-trapping-math
FLAGS_asan := -O1 -g -fno-omit-frame-pointer -fsanitize=address,undefined -fno-sanitize-recover=all
FLAGS_cov := -Og -g --coverage
C_ = -std=c11 -fopenmp $(WARN) $(WERROR) $(FLAGS_$(V)) $(CFLAGS)
LD_ = -fopenmp $(FLAGS_$(V)) $(LDFLAGS)

FLOORS := io phantoms recon metrics
PROGRAM_ONLY := io/command.c $(wildcard $(addsuffix /*_command.c,$(FLOORS)))
LIB_SRC := $(filter-out $(PROGRAM_ONLY),$(wildcard $(addsuffix /*.c,$(FLOORS))))
LIB_OBJ := $(LIB_SRC:%.c=$(B)/%.o) $(B)/embedded.o
PROGRAM_OBJ := $(PROGRAM_ONLY:%.c=$(B)/%.o) $(B)/scripts/tomogauge.o
TEST_SRC := $(wildcard tests/test_*.c)
TEST_OBJ := $(TEST_SRC:%.c=$(B)/%.o) $(B)/tests/main.o
FUZZ := $(patsubst tests/fuzz/fuzz_%.c,%,$(wildcard tests/fuzz/fuzz_*.c))
BENCH := $(patsubst tests/bench/bench_%.c,%,$(wildcard tests/bench/bench_*.c))
REFERENCE := $(wildcard tests/reference/*.py)
CHART ?= /usr/share/javascript/chart.js/chart.min.js
EMBED := $(wildcard metrics/page/*.css metrics/page/*.js) $(wildcard phantoms/*.yaml) $(CHART)
OUR_C := $(wildcard $(addsuffix /*.[ch],$(FLOORS) scripts tests tests/fuzz tests/bench))

.PHONY: help all check asan cov truth bench lint format install layers replay reference
.SECONDARY:

all: $(B)/tomogauge $(B)/libtomogauge.a ## all: the program and the library

help: ## help: this list
	@sed -n 's/^[a-z%-]*:.*## //p' $(MAKEFILE_LIST) | awk -F': ' '{ printf "  make %-10s %s\n", $$1, $$2 }'

$(B)/tomogauge: $(PROGRAM_OBJ) $(B)/libtomogauge.a
	$(CC) $(LD_) $^ $(LIBS_) -o $@

$(B)/libtomogauge.a: $(LIB_OBJ)
	@rm -f $@
	ar rcs $@ $^

$(B)/%.o: %.c Makefile
	@mkdir -p $(@D)
	$(CC) $(CPP_) -MMD -MP $(C_) -c $< -o $@

$(B)/metrics/results_file.o: CPP_ += -DTG_LIBRARIES='"$(shell for p in $(PKGS); do echo "$$p $$(pkg-config --modversion $$p)"; done | paste -sd, | sed 's/,/, /g')"'

$(B)/embedded.c: scripts/embed $(EMBED)
	@mkdir -p $(@D)
	scripts/embed $(EMBED) > $@.part && mv $@.part $@

$(B)/embedded.o: $(B)/embedded.c
	$(CC) $(CPP_) -MMD -MP $(C_) -c $< -o $@

# every tests/test_NAME.c defines Suite *suite_NAME(void)
$(B)/tests/suites.h: $(TEST_SRC) Makefile
	@mkdir -p $(@D)
	@printf 'SUITE(%s)\n' $(patsubst tests/test_%.c,%,$(TEST_SRC)) > $@
$(B)/tests/main.o: $(B)/tests/suites.h
$(B)/tests/main.o: CPP_ += -I$(B)/tests

# tests/test_memory.c takes aligned_alloc's place, to let it fail
$(B)/check: $(TEST_OBJ) $(B)/libtomogauge.a
	$(CC) $(LD_) -Wl,--wrap=aligned_alloc $^ $(LIBS_) $(shell pkg-config --libs check) -o $@

check: $(B)/check $(B)/tomogauge replay ## check: all tests (unit tests, fuzz corpus, reference libraries)
	TOMOGAUGE=$(B)/tomogauge $(B)/check
	@$(MAKE) --no-print-directory V=$(V) reference

reference: $(B)/tomogauge
	@TOMOGAUGE=$(B)/tomogauge PYTHON=$(PYTHON) tests/reference/run $(REFERENCE)

$(B)/replay-%: $(B)/tests/fuzz/fuzz_%.o $(B)/tests/fuzz/replay.o $(B)/libtomogauge.a
	$(CC) $(LD_) $^ $(LIBS_) -o $@
replay: $(FUZZ:%=$(B)/replay-%)
	@for f in $(FUZZ); do $(B)/replay-$$f tests/fuzz/corpus/$$f/* || exit 1; done

asan: export OMP_NUM_THREADS := 2
asan: export TG_DRAWS := 40
asan: ## asan: the same tests under the address and undefined-behaviour sanitizers
	$(MAKE) V=asan check

# counters shared by threads crawl, and statistics are not the point
cov: export OMP_NUM_THREADS := 1
cov: export TG_DRAWS := 20
cov: ## cov: line coverage of the unit tests, by folder
	$(MAKE) V=cov build/cov/check build/cov/tomogauge
	TOMOGAUGE=build/cov/tomogauge build/cov/check
	tests/coverage $(FLOORS)

truth: $(B)/check ## truth: coverage of the stated uncertainties over 2000 draws (long)
	TG_DRAWS=2000 $(B)/check truth

$(B)/bench-%: $(B)/tests/bench/bench_%.o $(B)/libtomogauge.a
	$(CC) $(LD_) $^ $(LIBS_) -o $@
bench: $(BENCH:%=$(B)/bench-%) ## bench: speed as ratios to ceilings measured in the same run
	@for b in $^; do $$b || exit 1; done

fuzz-%: tests/fuzz/fuzz_%.c $(B)/embedded.c ## fuzz-NAME: T=60 seconds of libFuzzer on one reader (fits yaml phantom ...)
	@mkdir -p build/fuzz/$*
	clang $(CPP_) -std=c11 -g -O1 -fsanitize=fuzzer,address,undefined -fno-sanitize-recover=all -Wno-unknown-pragmas \
	    $< $(LIB_SRC) $(B)/embedded.c $(LIBS_) -lgomp -o build/fuzz/fuzz-$*
	build/fuzz/fuzz-$* -max_total_time=$(T) -timeout=20 -rss_limit_mb=4096 build/fuzz/$* tests/fuzz/corpus/$*

lint: ## lint: clang at the same strict level, cppcheck, layout of the sources
	$(MAKE) CC=clang V=lint WERROR=-Werror build/lint/tomogauge build/lint/check
	cppcheck --quiet --std=c11 --enable=warning,portability,performance --inline-suppr --error-exitcode=1 -I. $(FLOORS) scripts
	clang-format --dry-run --Werror $(OUR_C)

format: ## format: lay the sources out by .clang-format
	clang-format -i $(OUR_C)

layers: $(B)/tomogauge $(B)/check ## layers: includes go one way, each third-party header has one user
	scripts/layers $(B)

install: all ## install: program, library and descriptions under PREFIX=/usr/local
	install -D $(B)/tomogauge $(DESTDIR)$(PREFIX)/bin/tomogauge
	install -D -m 644 $(B)/libtomogauge.a $(DESTDIR)$(PREFIX)/lib/libtomogauge.a
	for h in $(wildcard $(addsuffix /*.h,$(FLOORS))); do install -D -m 644 $$h $(DESTDIR)$(PREFIX)/include/tomogauge/$$h; done
	for y in phantoms/*.yaml; do install -D -m 644 $$y $(DESTDIR)$(PREFIX)/share/tomogauge/$$y; done

-include $(shell find $(B) -name '*.d' 2>/dev/null)
