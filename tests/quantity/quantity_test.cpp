// SPDX-License-Identifier: MIT
#include <catch2/catch.hpp>

#include "engine/netlist/sha256.h"
#include "engine/quantity/quantity.h"

using namespace couplet;

TEST_CASE("plain prefixed units give the nearest double") {
  CHECK(read_quantity("4.7 uF", "F").value == 4.7e-6);
  CHECK(read_quantity("50 mohm", "ohm").value == 0.05);
  CHECK(read_quantity("157.48 kHz", "Hz").value == 157480.0);
  CHECK(read_quantity("0.1 MHz", "Hz").value == 0.1e6);
  CHECK(read_quantity("3.3e3 pF", "F").value == Approx(3.3e-9).epsilon(1e-15));
  CHECK(read_quantity("-12 V", "V").value == -12);
  CHECK(read_quantity("12V", "V").value == 12);
}

TEST_CASE("UDUNITS-2 converts the rest") {
  CHECK(read_quantity("1 minute", "s").value == 60);
  CHECK(read_quantity("2 ohm.s", "H").value == Approx(2));
  CHECK(read_quantity("20 %", "1").value == 0.2);
  CHECK(read_quantity("0.5", "1").value == 0.5);
}

TEST_CASE("a wrong unit trips the reader") {
  for (const char* text : {"10", "10 A", "ten V", "", "V", "10 Vv", "1e999 V", "0x10 V", "nan V", "inf V"}) {
    INFO(text);
    CHECK_FALSE(read_quantity(text, "V").problem.empty());
  }
}

TEST_CASE("printing chooses the prefix after rounding") {
  CHECK(print_quantity(999.96, "ohm", 4) == "1 kohm");
  CHECK(print_quantity(999.94, "ohm", 4) == "999.9 ohm");
  CHECK(print_quantity(4.7e-6, "F") == "4.7 uF");
  CHECK(print_quantity(0, "V") == "0 V");
  CHECK(print_quantity(-0.0123, "V", 3) == "-12.3 mV");
  CHECK(print_quantity(0.25, "1") == "0.25");
}

TEST_CASE("SHA-256 gives the examples of FIPS 180-4") {
  // The two classic examples of the standard (published by NIST with it), and the empty message.
  CHECK(sha256("abc") == "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
  CHECK(sha256("abcdbcdecdefdefgefghfghighijhijkijkljklmklmnlmnomnopnopq") == "248d6a61d20638b8e5c026930c3e6039a33ce45964ff2167f6ecedd419db06c1");
  CHECK(sha256("") == "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855");
}
