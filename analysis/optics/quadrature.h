// Gauss-Legendre quadrature: integrals of smooth functions over a finite range.
#pragma once

#include <array>
#include <cmath>
#include <numbers>

namespace focusfall {

// Nodes and weights on (-1, 1). Exact for polynomials up to degree 2 Points - 1.
// Roots of the Legendre polynomial by Newton's method from the starting values of Abramowitz & Stegun, Handbook of
// Mathematical Functions (1964), 22.16.6; weights 2 / ((1 - x^2) P'(x)^2), 25.4.29 (clauses from memory).
template <int Points>
struct GaussLegendre {
  std::array<double, Points> nodes{};
  std::array<double, Points> weights{};

  GaussLegendre() {
    for (int i = 0; i < Points; ++i) {
      double x = std::cos(std::numbers::pi * (i + 0.75) / (Points + 0.5));
      double derivative = 0;
      for (int iteration = 0; iteration < 8; ++iteration) {
        double p = 1, previous = 0;
        for (int k = 1; k <= Points; ++k) {
          const double before = previous;
          previous = p;
          p = ((2 * k - 1) * x * previous - (k - 1) * before) / k;
        }
        derivative = Points * (x * p - previous) / (x * x - 1);
        x -= p / derivative;
      }
      nodes[static_cast<std::size_t>(i)] = x;
      weights[static_cast<std::size_t>(i)] = 2 / ((1 - x * x) * derivative * derivative);
    }
  }

  // Integral of `function` from low to high.
  template <class Function>
  double operator()(Function function, double low, double high) const {
    const double half = 0.5 * (high - low), middle = 0.5 * (high + low);
    double sum = 0;
    for (std::size_t i = 0; i < Points; ++i) sum += weights[i] * function(middle + half * nodes[i]);
    return half * sum;
  }
};

}  // namespace focusfall
