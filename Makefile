# tarry: build, test, install. See DEVELOPERS.md.
BUILD ?= build
CC ?= cc
CFLAGS ?= -O2 -g
WARNINGS = -Wall -Wextra -Wshadow -Wconversion -Wstrict-prototypes
ALL_CFLAGS = -std=c11 -D_POSIX_C_SOURCE=200809L $(WARNINGS) -ffp-contract=off -fopenmp -Iinclude -Isrc $(CFLAGS)
LIBS = -lgsl -lgslcblas -lyaml -ljansson -lnettle -lm

LIB_SOURCES = $(sort $(filter-out src/cli/%,$(wildcard src/*/*.c)))
CLI_SOURCES = $(sort $(wildcard src/cli/*.c))
LIB_OBJECTS = $(LIB_SOURCES:%.c=$(BUILD)/%.o)
CLI_OBJECTS = $(CLI_SOURCES:%.c=$(BUILD)/%.o)
TEST_SOURCES = $(sort $(wildcard tests/unit/test_*.c tests/against/test_*.c))
SUPPORT_SOURCES = $(sort $(filter-out $(TEST_SOURCES),$(wildcard tests/unit/*.c tests/against/*.c)))
SUPPORT_OBJECTS = $(SUPPORT_SOURCES:%.c=$(BUILD)/%.o)
TESTS = $(TEST_SOURCES:%.c=$(BUILD)/%)

# Calls that tests make fail on purpose (tests/unit/faults.h).
FAULTS = malloc calloc realloc open read write fsync close rename
TEST_LDFLAGS = $(FAULTS:%=-Wl,--wrap=%)

all: $(BUILD)/tarry

$(BUILD)/tarry: $(CLI_OBJECTS) $(BUILD)/libtarry.a
	$(CC) $(ALL_CFLAGS) $(LDFLAGS) -o $@ $^ $(LIBS)

$(BUILD)/libtarry.a: $(LIB_OBJECTS)
	rm -f $@ && $(AR) rcs $@ $^

$(BUILD)/%.o: %.c
	@mkdir -p $(@D)
	$(CC) $(ALL_CFLAGS) -MMD -MP -c -o $@ $<

# An archive, so that a test program pulls in only what it uses.
$(BUILD)/libsupport.a: $(SUPPORT_OBJECTS)
	rm -f $@ && $(AR) rcs $@ $^

# One program a test file: make build/tests/unit/test_random
$(TESTS): $(BUILD)/%: $(BUILD)/%.o $(BUILD)/libsupport.a $(BUILD)/libtarry.a
	$(CC) $(ALL_CFLAGS) -Itests/unit $(LDFLAGS) $(TEST_LDFLAGS) -o $@ $^ -lcheck -lsubunit -lrt -lpthread $(LIBS)

tests: $(TESTS)

clean:
	rm -rf $(BUILD)

.PHONY: all tests clean
.SECONDARY:
-include $(LIB_OBJECTS:.o=.d) $(CLI_OBJECTS:.o=.d) $(SUPPORT_OBJECTS:.o=.d) $(TESTS:=.d)
