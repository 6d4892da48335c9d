# SPDX-License-Identifier: GPL-3.0-or-later
# tarry: build, test, check, install. DEVELOPERS.md tells what each goal is for.
#
# Goals that a fresh machine may start with (demo, test, lint, bench) look for the packages that they
# need first and install what is missing (tests/deps.sh); all others only build.

BUILD ?= build
CC ?= cc
CFLAGS ?= -O2 -g
JOBS ?= $(shell getconf _NPROCESSORS_ONLN 2>/dev/null || echo 2)
PREFIX ?= /usr/local
DESTDIR ?=
INSTALL ?= install

WARNINGS = -Wall -Wextra -Wshadow -Wconversion -Wstrict-prototypes
STANDARD = -std=c11 -D_POSIX_C_SOURCE=200809L $(WARNINGS) -ffp-contract=off -fopenmp
ALL_CFLAGS = $(STANDARD) -Iinclude -Isrc -Itests/unit -Itests/fuzz $(CFLAGS)
LIBS = -lgsl -lgslcblas -lyaml -ljansson -lnettle -lm

# Calls that tests make fail on purpose (tests/unit/faults.h).
FAULTS = malloc calloc realloc strdup strndup open read write fsync close rename
FAULTS += tarry_arena_calloc tarry_arena_text tarry_arena_format tarry_arena_grow
TEST_LDFLAGS = $(FAULTS:%=-Wl,--wrap=%)

LIB_SOURCES = $(sort $(filter-out src/cli/%,$(wildcard src/*/*.c)))
CLI_SOURCES = $(sort $(wildcard src/cli/*.c))
TEST_SOURCES = $(sort $(wildcard tests/unit/test_*.c tests/against/test_*.c))
SLOW_SOURCES = $(sort $(wildcard tests/*/slow_*.c))
BENCH_SOURCES = $(sort $(wildcard tests/bench/*.c))
EXAMPLE_SOURCES = $(wildcard tests/unit/example.c)
SUPPORT_SOURCES = $(sort $(filter-out $(TEST_SOURCES) $(SLOW_SOURCES) $(EXAMPLE_SOURCES),\
                    $(wildcard tests/unit/*.c tests/against/*.c tests/fuzz/fuzz*.c)))

LIB_OBJECTS = $(LIB_SOURCES:%.c=$(BUILD)/%.o)
CLI_OBJECTS = $(CLI_SOURCES:%.c=$(BUILD)/%.o) $(BUILD)/demo_model.o
SUPPORT_OBJECTS = $(SUPPORT_SOURCES:%.c=$(BUILD)/%.o)
BENCH_OBJECTS = $(BENCH_SOURCES:%.c=$(BUILD)/%.o)
TESTS = $(TEST_SOURCES:%.c=$(BUILD)/%)
SLOW_TESTS = $(SLOW_SOURCES:%.c=$(BUILD)/%)
EXAMPLES = $(EXAMPLE_SOURCES:%.c=$(BUILD)/%)

all: $(BUILD)/tarry

$(BUILD)/tarry: $(CLI_OBJECTS) $(BUILD)/libtarry.a
	$(CC) $(ALL_CFLAGS) $(LDFLAGS) -o $@ $^ $(LIBS)

$(BUILD)/libtarry.a: $(LIB_OBJECTS) $(BUILD)/members
	rm -f $@ && $(AR) rcs $@ $(LIB_OBJECTS)

# An archive, so that a test takes from it only what it calls.
$(BUILD)/libsupport.a: $(SUPPORT_OBJECTS) $(BUILD)/members
	rm -f $@ && $(AR) rcs $@ $(SUPPORT_OBJECTS)

$(BUILD)/%.o: %.c $(BUILD)/flags
	@mkdir -p $(@D)
	$(CC) $(ALL_CFLAGS) -MMD -MP -c -o $@ $<

$(BUILD)/src/base/start.o: private ALL_CFLAGS += -DTARRY_FLAGS='"$(STANDARD) $(CFLAGS)"'

# The shared library: objects of their own, since code that can lie anywhere is a little slower. What it hands out
# is what include/tarry declares (tests/exports.awk), and nothing else.
SONAME = libtarry.so.0
SHARED_OBJECTS = $(LIB_SOURCES:%.c=$(BUILD)/shared/%.o)

$(BUILD)/shared/%.o: %.c $(BUILD)/flags
	@mkdir -p $(@D)
	$(CC) $(ALL_CFLAGS) -fPIC -MMD -MP -c -o $@ $<

$(BUILD)/shared/src/base/start.o: private ALL_CFLAGS += -DTARRY_FLAGS='"$(STANDARD) $(CFLAGS) -fPIC"'

$(BUILD)/exports.map: tests/exports.awk $(wildcard include/tarry/*.h)
	@mkdir -p $(@D)
	awk -f tests/exports.awk $(wildcard include/tarry/*.h) > $@.new && mv $@.new $@

$(BUILD)/$(SONAME): $(SHARED_OBJECTS) $(BUILD)/exports.map $(BUILD)/members
	$(CC) $(ALL_CFLAGS) $(LDFLAGS) -shared -Wl,-soname,$(SONAME) -Wl,--version-script=$(BUILD)/exports.map \
	  -Wl,-z,defs -o $@ $(SHARED_OBJECTS) $(LIBS) -lpthread

shared: $(BUILD)/$(SONAME)

# models/two_state.yaml, byte by byte, as what `tarry run` without a model runs.
$(BUILD)/demo_model.c: models/two_state.yaml
	@mkdir -p $(@D)
	{ echo '#include <stddef.h>'; \
	  echo 'extern const char tarry_demo_model[];'; \
	  echo 'extern const size_t tarry_demo_model_size;'; \
	  echo 'const char tarry_demo_model[] = {'; \
	  od -An -v -tx1 $< | sed "s/ *\([0-9a-f][0-9a-f]\)/'\\\\x\1',/g"; \
	  echo '0};'; \
	  echo 'const size_t tarry_demo_model_size = sizeof tarry_demo_model - 1;'; } > $@.new
	mv $@.new $@

$(BUILD)/demo_model.o: $(BUILD)/demo_model.c $(BUILD)/flags
	$(CC) $(ALL_CFLAGS) -c -o $@ $<

# Files whose text changes with the compiler and its flags, and with the list of the library's parts:
# what depends on them is built anew then.
quoted = '$(subst ','\'',$(1))'
define keep_text
@mkdir -p $(@D)
@printf '%s\n' $(call quoted,$(1)) | cmp -s - $@ || printf '%s\n' $(call quoted,$(1)) > $@
endef

$(BUILD)/flags: FORCE
	$(call keep_text,$(CC) $(ALL_CFLAGS) $(LDFLAGS))

$(BUILD)/members: FORCE
	$(call keep_text,$(LIB_OBJECTS) $(SUPPORT_OBJECTS))

# These call the command line as the shell does (tests/unit/whole_program.h).
WHOLE_PROGRAM_TESTS = $(addprefix $(BUILD)/tests/unit/test_,lost_memory lost_files killed)
$(WHOLE_PROGRAM_TESTS): $(filter-out %/main.o,$(CLI_OBJECTS))

# Libraries that need each other stand in a group. One program a test file: make build/tests/unit/test_pending
$(TESTS) $(SLOW_TESTS): $(BUILD)/%: $(BUILD)/%.o $(BUILD)/libsupport.a $(BUILD)/libtarry.a
	$(CC) $(ALL_CFLAGS) $(LDFLAGS) $(TEST_LDFLAGS) -o $@ $(filter %.o,$^) \
	  -Wl,--start-group $(BUILD)/libsupport.a $(BUILD)/libtarry.a -lcheck -lsubunit -Wl,--end-group \
	  -lrt -lpthread $(LIBS)

$(EXAMPLES): $(BUILD)/%: $(BUILD)/%.o $(BUILD)/libtarry.a
	$(CC) $(ALL_CFLAGS) $(LDFLAGS) -o $@ $^ $(LIBS)

$(BUILD)/bench: $(BENCH_OBJECTS) $(BUILD)/libtarry.a
	$(CC) $(ALL_CFLAGS) $(LDFLAGS) -o $@ $^ $(LIBS)

tests: $(TESTS) $(EXAMPLES)

tests-slow: $(SLOW_TESTS)

everything: all tests tests-slow $(if $(BENCH_SOURCES),$(BUILD)/bench)

list-tests:
	@printf '%s\n' $(TESTS) $(EXAMPLES)

list-tests-slow:
	@printf '%s\n' $(SLOW_TESTS)

deps:
	@CC='$(CC)' sh tests/deps.sh build

deps-test:
	@CC='$(CC)' sh tests/deps.sh build test

deps-dev:
	@CC='$(CC)' sh tests/deps.sh build test dev

demo: deps
	@$(MAKE) --no-print-directory -s -j$(JOBS) all
	@$(BUILD)/tarry run models/two_state.yaml --out two_state.out --overwrite

test: deps-test
	@MAKE='$(MAKE)' BUILD='$(BUILD)' JOBS='$(JOBS)' sh tests/run.sh plain sanitized

test-slow: deps-test
	@MAKE='$(MAKE)' BUILD='$(BUILD)' JOBS='$(JOBS)' sh tests/run.sh slow

coverage: deps-test
	@$(MAKE) --no-print-directory -j$(JOBS) $(BUILD)/tests/against/slow_coverage
	@$(BUILD)/tests/against/slow_coverage


branches: deps-test
	@MAKE='$(MAKE)' BUILD='$(BUILD)' JOBS='$(JOBS)' sh tests/branches.sh

# Fuzzing: the library anew with what libFuzzer needs, in a folder of its own. FUZZ_FLAGS say what to look for.
FUZZ_TARGETS = model expression quantity table data
FUZZ_FLAGS = -fsanitize=address,undefined -fno-sanitize-recover=all
SECONDS ?= 60

fuzz: deps-dev
	@$(MAKE) --no-print-directory -s -j$(JOBS) BUILD=$(BUILD)-fuzz CC=clang \
	  CFLAGS='-O1 -g -fsanitize=fuzzer-no-link $(FUZZ_FLAGS)' $(FUZZ_TARGETS:%=$(BUILD)-fuzz/fuzz_%)
	@sh tests/fuzz/run.sh $(BUILD)-fuzz $(SECONDS) $(FUZZ_TARGETS)

FUZZ_OBJECTS = $(patsubst %.c,$(BUILD)/%.o,$(wildcard tests/fuzz/fuzz*.c))
$(FUZZ_TARGETS:%=$(BUILD)/fuzz_%): $(BUILD)/fuzz_%: tests/fuzz/entry.c $(FUZZ_OBJECTS) $(BUILD)/libtarry.a
	$(CC) $(ALL_CFLAGS) -DFUZZ_TARGET=fuzz_$* -fsanitize=fuzzer $(LDFLAGS) -o $@ $^ $(LIBS)

lint: deps-dev
	@MAKE='$(MAKE)' BUILD='$(BUILD)' JOBS='$(JOBS)' sh tests/lint.sh

bench: deps
	@$(MAKE) --no-print-directory -s -j$(JOBS) $(BUILD)/bench
	@$(BUILD)/bench

tsan: deps-dev
	@MAKE='$(MAKE)' BUILD='$(BUILD)' JOBS='$(JOBS)' sh tests/tsan.sh

memcheck: deps-dev
	@MAKE='$(MAKE)' BUILD='$(BUILD)' JOBS='$(JOBS)' sh tests/memcheck.sh

instructions: deps-dev
	@MAKE='$(MAKE)' BUILD='$(BUILD)' JOBS='$(JOBS)' sh tests/instructions.sh

format: deps-dev
	clang-format -i $$(git ls-files '*.c' '*.h')

LIBDIR ?= $(PREFIX)/lib
VERSION = $(shell sed -n 's/^.define TARRY_VERSION "\(.*\)"/\1/p' include/tarry/tarry.h)

# What a program that links the library needs to know; Libs.private is for the static one.
$(BUILD)/tarry.pc: FORCE
	@mkdir -p $(@D)
	@printf '%s\n' 'prefix=$(PREFIX)' 'libdir=$(LIBDIR)' 'includedir=$${prefix}/include' '' \
	  'Name: tarry' 'Description: Simulation of gene expression with lags' 'Version: $(VERSION)' \
	  'Cflags: -I$${includedir}' 'Libs: -L$${libdir} -ltarry' \
	  'Libs.private: $(LIBS) -lpthread' > $@

install: all shared $(BUILD)/tarry.pc
	$(INSTALL) -d $(DESTDIR)$(PREFIX)/bin $(DESTDIR)$(LIBDIR)/pkgconfig $(DESTDIR)$(PREFIX)/include/tarry \
	  $(DESTDIR)$(PREFIX)/share/doc/tarry $(DESTDIR)$(PREFIX)/share/tarry/models \
	  $(DESTDIR)$(PREFIX)/share/man/man1 $(DESTDIR)$(PREFIX)/share/bash-completion/completions \
	  $(DESTDIR)$(PREFIX)/share/zsh/site-functions
	$(INSTALL) -m 755 $(BUILD)/tarry $(DESTDIR)$(PREFIX)/bin/tarry
	$(INSTALL) -m 644 $(BUILD)/libtarry.a $(DESTDIR)$(LIBDIR)/libtarry.a
	$(INSTALL) -m 755 $(BUILD)/$(SONAME) $(DESTDIR)$(LIBDIR)/$(SONAME)
	ln -sf $(SONAME) $(DESTDIR)$(LIBDIR)/libtarry.so
	$(INSTALL) -m 644 $(BUILD)/tarry.pc $(DESTDIR)$(LIBDIR)/pkgconfig/tarry.pc
	$(INSTALL) -m 644 include/tarry/*.h $(DESTDIR)$(PREFIX)/include/tarry
	$(BUILD)/tarry help --as man > $(BUILD)/tarry.1
	$(BUILD)/tarry help --as bash > $(BUILD)/completion.bash
	$(BUILD)/tarry help --as zsh > $(BUILD)/completion.zsh
	$(INSTALL) -m 644 $(BUILD)/tarry.1 $(DESTDIR)$(PREFIX)/share/man/man1/tarry.1
	$(INSTALL) -m 644 $(BUILD)/completion.bash $(DESTDIR)$(PREFIX)/share/bash-completion/completions/tarry
	$(INSTALL) -m 644 $(BUILD)/completion.zsh $(DESTDIR)$(PREFIX)/share/zsh/site-functions/_tarry
	$(INSTALL) -m 644 $(wildcard *.md docs/*) $(DESTDIR)$(PREFIX)/share/doc/tarry
	$(INSTALL) -m 644 $(wildcard models/*.*) $(DESTDIR)$(PREFIX)/share/tarry/models

uninstall:
	rm -f $(DESTDIR)$(PREFIX)/bin/tarry $(DESTDIR)$(LIBDIR)/libtarry.a $(DESTDIR)$(LIBDIR)/libtarry.so \
	  $(DESTDIR)$(LIBDIR)/$(SONAME) $(DESTDIR)$(LIBDIR)/pkgconfig/tarry.pc \
	  $(DESTDIR)$(PREFIX)/share/man/man1/tarry.1 \
	  $(DESTDIR)$(PREFIX)/share/bash-completion/completions/tarry \
	  $(DESTDIR)$(PREFIX)/share/zsh/site-functions/_tarry
	rm -rf $(DESTDIR)$(PREFIX)/include/tarry $(DESTDIR)$(PREFIX)/share/doc/tarry $(DESTDIR)$(PREFIX)/share/tarry

clean:
	rm -rf $(BUILD) $(BUILD)-asan $(BUILD)-branches $(BUILD)-fuzz $(BUILD)-lint-gcc $(BUILD)-lint-clang $(BUILD)-tsan

FORCE:
.PHONY: all tests tests-slow everything list-tests list-tests-slow deps deps-test deps-dev demo test \
  test-slow coverage branches fuzz lint tsan memcheck instructions bench format install uninstall shared clean FORCE
.SECONDARY:
.DELETE_ON_ERROR:
-include $(LIB_OBJECTS:.o=.d) $(SHARED_OBJECTS:.o=.d) $(CLI_OBJECTS:.o=.d) $(SUPPORT_OBJECTS:.o=.d) $(BENCH_OBJECTS:.o=.d) \
  $(TESTS:=.d) $(SLOW_TESTS:=.d) $(EXAMPLES:=.d)
