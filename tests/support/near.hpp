// Comparisons that fail on NaN and know what a complex number is.
#pragma once
#include <boost/test/unit_test.hpp>
#include <cmath>
#include <complex>

namespace kiloamp::test {

/// |a - b| <= tolerance; false when anything is NaN.
inline boost::test_tools::predicate_result near(std::complex<double> a, std::complex<double> b,
                                                double tolerance) {
  const double difference = std::abs(a - b);
  boost::test_tools::predicate_result result(difference <= tolerance);
  if (!result)
    result.message() << a << " differs from " << b << " by " << difference << ", more than " << tolerance;
  return result;
}

/// Magnitude and angle in degrees, as examples print them.
inline std::complex<double> polar_deg(double magnitude, double deg) {
  return std::polar(magnitude, deg * 3.14159265358979323846 / 180);
}

}  // namespace kiloamp::test
