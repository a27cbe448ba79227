#include <cmath>

#include "engine/sequence/circuit.hpp"

namespace kiloamp {

Complex part_of(Complex z, Part part) {
  if (part == Part::whole) return z;
  if (part == Part::reactance) return {0, z.imag()};
  return z.real() != 0 ? z.real() : std::abs(z.imag()) / kLargestElementXOverR;
}

Complex part_of_shunt(Complex z, Part part) {
  if (part == Part::whole) return z;
  return part == Part::reactance ? Complex(0, z.imag()) : Complex(std::abs(z.imag()) * kLargestElementXOverR);
}

Circuit series_circuit(BusIndex from, BusIndex to, const BySequence<Complex>& z_ohm) {
  Circuit circuit;
  circuit.terminals = 2;
  circuit.bus = {from, to, {}};
  for (int s = 0; s < 3; ++s) {
    const Complex y = 1.0 / z_ohm[s];
    circuit.y_siemens[s][0] = {y, -y, 0};
    circuit.y_siemens[s][1] = {-y, y, 0};
    circuit.group[s] = {0, 0, -1};
  }
  return circuit;
}

BySequence<Complex> line_impedance_ohm(const Line& line) {
  const double scale = line.length_km / line.parallel.value_or(1);
  const Complex z1 = scale * Complex(line.r1_ohm_per_km, line.x1_ohm_per_km);
  const Complex z0 = scale * Complex(line.r0_ohm_per_km.value_or(0), line.x0_ohm_per_km.value_or(0));
  return {z0, z1, z1};
}

BySequence<Complex> line_charging_siemens(const Line& line) {
  const double scale = 1e-6 * line.length_km * line.parallel.value_or(1);
  const Complex y1(0, scale * line.b1_us_per_km.value_or(0));
  return {Complex(0, scale * line.b0_us_per_km.value_or(0)), y1, y1};
}

Complex reactor_impedance_ohm(const SeriesReactor& reactor) {
  const double r = reactor.r_ohm.value_or(0);
  if (reactor.x_ohm) return {r, *reactor.x_ohm};
  return {r, *reactor.x_percent / 100 * *reactor.rated_kv * 1000 / (std::sqrt(3.0) * *reactor.rated_a)};
}

}  // namespace kiloamp
