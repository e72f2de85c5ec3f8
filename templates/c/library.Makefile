# lib{{ prefix }}: {{ title }}
#
#   make            static and shared library for this machine
#   make portable   for any machine of this kind
#   make install    into PREFIX (default /usr/local)
CC ?= cc
AR ?= ar
CFLAGS ?= -O3 -march=native
STRICT = -std=c11 -ffp-contract=off -fno-math-errno -fPIC -fvisibility=hidden
PREFIX ?= /usr/local

# What the compiler does not know is left out.
accepts = $(shell echo 'int main(void) { return 0; }' > .probe.c; $(CC) $(1) -o .probe .probe.c 2>/dev/null && echo '$(1)'; rm -f .probe .probe.c)
OPENMP := $(call accepts,-fopenmp)
ifeq ($(call accepts,$(CFLAGS)),)
CFLAGS := -O3
endif

.PHONY: all portable install clean

all: lib{{ prefix }}.a lib{{ prefix }}.so {{ prefix }}.pc

{{ prefix }}.o: {{ prefix }}.c {{ prefix }}.h
	$(CC) $(STRICT) $(CFLAGS) $(OPENMP) -c -o $@ {{ prefix }}.c

lib{{ prefix }}.a: {{ prefix }}.o
	$(AR) rcs $@ {{ prefix }}.o

lib{{ prefix }}.so: {{ prefix }}.o
	$(CC) -shared $(OPENMP) -o $@ {{ prefix }}.o -lm

{{ prefix }}.pc: {{ prefix }}.pc.in
	sed -e 's|@PREFIX@|$(PREFIX)|' -e 's|@OPENMP@|$(OPENMP)|' {{ prefix }}.pc.in > $@

portable: CFLAGS := -O3
portable: clean all

install: all
	mkdir -p $(PREFIX)/lib/pkgconfig $(PREFIX)/include
	cp lib{{ prefix }}.a lib{{ prefix }}.so $(PREFIX)/lib
	cp {{ prefix }}.pc $(PREFIX)/lib/pkgconfig
	cp {{ prefix }}.h $(PREFIX)/include

clean:
	rm -f {{ prefix }}.o lib{{ prefix }}.a lib{{ prefix }}.so {{ prefix }}.pc
