// Plain loops compiled twice: for any x86-64 and for processors with AVX2, chosen when the program is loaded.
// The arithmetic is the same but for the order of sums, which -fassociative-math leaves open already; clang 14 and other
// architectures take the loop as it stands.
#pragma once

#if defined(__x86_64__) && defined(__GNUC__) && !defined(__clang__)
#define FOCUSFALL_VECTOR __attribute__((target_clones("arch=haswell", "default")))
#else
#define FOCUSFALL_VECTOR
#endif
