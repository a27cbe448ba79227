#include "engine/study/outage_worker.hpp"

#include <Eigen/LU>
#include <Eigen/SVD>
#include <algorithm>
#include <limits>

#include "engine/study/outage_loops.hpp"

namespace kiloamp::detail {

namespace {

// Below this the small matrix may be singular: the graph is asked whether the outage cuts something off. What
// is cut off without a source may still have an impedance of its own and then the matrix is only small; below
// kSingular it is round-off.
constexpr double kSuspectSplit = 1e-6;
constexpr double kSingular = 1e-12;
// A difference above this part of its terms has kept its digits.
constexpr double kWellConditioned = 1e-3;
// A vector is a combination of others when less than this part of it is left over.
constexpr double kInSpan = 1e-9;
constexpr double kInfinite = std::numeric_limits<double>::infinity();

// K = U^T W.
Eigen::MatrixXcd projected(const OutageChange& o, int s,
                           const std::function<Complex(std::size_t, Node, int)>& w) {
  const int rank = o.rank[s];
  Eigen::MatrixXcd k(rank, rank);
  for (int a = 0; a < rank; ++a)
    for (int b = 0; b < rank; ++b) {
      Complex sum = 0;
      for (std::size_t place = 0; place < o.nodes.size(); ++place)
        sum += o.u[s][static_cast<std::size_t>(a)][place] * w(static_cast<std::size_t>(b), o.nodes[place], s);
      k(a, b) = sum;
    }
  return k;
}

double largest_of(const std::vector<Complex>& d) {
  double size = 0;
  for (const Complex one : d) size = std::max(size, std::abs(one));
  return size;
}

}  // namespace

OutagePlaces::OutagePlaces(const Study& study) : of_bus(study.network().buses.size(), kNone) {
  const SequenceModel& m = study.model();
  const auto& solved = study.solver().solved();
  const auto solver = solved.factors().sparse_solver();
  for (const BusIndex bus : study.wanted_buses()) {
    const Node node = m.node_of_bus[at(bus)];
    if (node == Node::none) continue;
    const double ohm = m.base_ohm(bus);
    const Complex phase = study.options().phase_ohm / ohm, earth = study.options().earth_ohm / ohm;
    row.push_back({bus, node, solver.position(static_cast<sparse::Index>(node)),
                   solved.inverse().diagonal[at(node)], phase, 3.0 * (phase + earth)});
  }
  std::stable_sort(row.begin(), row.end(),
                   [](const OutagePlace& a, const OutagePlace& b) { return a.position < b.position; });
  for (std::uint32_t place = 0; place < row.size(); ++place) of_bus[at(row[place].bus)] = place;
}

OutageWorker::OutageWorker(const Study& study, const OutagePlaces& places)
    : model_(study.model()),
      solved_(study.solver().solved()),
      places_(places),
      solvers_{solved_.factors().sparse_solver(), solved_.factors().sparse_solver()},
      lost_(model_, solved_),
      three_phase_(places.row.size()),
      line_to_ground_(places.row.size()) {}

void OutageWorker::run(std::span<const OutageChange> outages, const Visit& visit) {
  std::vector<std::size_t> together;
  for (std::size_t k = 0; k < outages.size(); ++k) {
    if (outages[k].split || outages[k].columns() > static_cast<int>(kColumns)) {
      alone(outages[k], k, visit);
      continue;
    }
    together.push_back(k);
    if (together.size() < kSide) continue;
    side_by_side(outages, together, visit);
    together.clear();
  }
  if (!together.empty()) side_by_side(outages, together, visit);
}

void OutageWorker::put(Solver& solver, int slot, const OutageChange& o, std::size_t r) const {
  for (std::size_t place = 0; place < o.nodes.size(); ++place) {
    Entry value{};
    for (int s = 0; s < 3; ++s)
      if (r < o.u[s].size() && lane(s) == static_cast<std::size_t>(s)) value[lane(s)] = o.u[s][r][place];
    solver.put(slot, static_cast<sparse::Index>(o.nodes[place]), value);
  }
}

void OutageWorker::side_by_side(std::span<const OutageChange> outages, std::span<const std::size_t> which,
                                const Visit& visit) {
  int columns = 1;  // an outage that changes nothing still reads solutions, of zeros
  for (const std::size_t k : which) columns = std::max(columns, outages[k].columns());
  for (std::size_t r = 0; r < static_cast<std::size_t>(columns); ++r) {
    solvers_[r].clear();
    for (std::size_t slot = 0; slot < which.size(); ++slot)
      put(solvers_[r], static_cast<int>(slot), outages[which[slot]], r);
    solvers_[r].solve();
  }
  std::array<Response, kSide> responses;
  for (std::size_t slot = 0; slot < which.size(); ++slot)
    responses[slot] = respond(outages[which[slot]], [&](std::size_t r, Node node, int s) {
      return solvers_[r].get(static_cast<int>(slot), static_cast<sparse::Index>(node))[lane(s)];
    });
  apply(std::span(responses).first(which.size()), columns > 1);
  OutageBatch batch{{}, three_phase_, line_to_ground_, {}};
  const auto is_unheld = [](const Response& r) { return r.unheld[0] || r.unheld[1] || r.unheld[2]; };
  std::vector<std::size_t> held, unheld;
  for (std::size_t slot = 0; slot < which.size(); ++slot) {
    const Response& response = responses[slot];
    if (is_unheld(response)) {
      unheld.push_back(which[slot]);
      continue;
    }
    const auto number = static_cast<int>(held.size());
    if (held.size() != slot) move_number(static_cast<int>(slot), number);
    drop_lost(outages[which[slot]], response, number);
    batch.lost[held.size()] = &response.lost;
    held.push_back(which[slot]);
  }
  batch.which = held;
  if (!held.empty()) visit(batch);
  for (const std::size_t k : unheld) alone(outages[k], k, visit);
}

void OutageWorker::move_number(int from, int to) {
  for (std::size_t place = 0; place < three_phase_.size(); ++place) {
    sparse::set_lane<4>(three_phase_[place], to, three_phase_[place][from]);
    sparse::set_lane<4>(line_to_ground_[place], to, line_to_ground_[place][from]);
  }
}

void OutageWorker::alone(const OutageChange& o, std::size_t k, const Visit& visit) {
  w_.resize(std::max(w_.size(), static_cast<std::size_t>(o.columns())));
  for (int r = 0; r < o.columns(); ++r) {
    auto& w = w_[static_cast<std::size_t>(r)];
    w.resize(model_.node_count());
    solvers_[0].clear();
    put(solvers_[0], 0, o, static_cast<std::size_t>(r));
    solvers_[0].solve();
    solvers_[0].copy(0, w);
  }
  Response response = respond(o, [&](std::size_t r, Node node, int s) { return w_[r][at(node)][lane(s)]; });
  for (int s = 0; s < 3; ++s)
    if (response.unheld[s]) hold_by_columns(o, s, response);
  for (std::size_t place = 0; place < places_.row.size(); ++place) general(o, response, place, false);
  if (o.split)
    for (const BusIndex bus : o.split->far_buses)
      if (const auto place = places_.of_bus[at(bus)]; place != OutagePlaces::kNone)
        general(o, response, place, true);
  drop_lost(o, response, 0);
  visit({std::span(&k, 1), three_phase_, line_to_ground_, {&response.lost}});
}

// D^-1 - u^T W of a strong element is a small difference of large numbers. Kirchhoff's law at a terminal
// node p says the same without it: what u_p injects and the element does not carry away, the rest does,
// rest_p = u_p d (D^-1 - u^T W). The better conditioned of the two is taken, by the size of the terms.
Complex OutageWorker::sharper(const OutageChange& o, int s, const Columns& w, Complex plain,
                              double plain_terms) const {
  Complex best = plain;
  double best_terms = plain_terms;
  if (std::abs(plain) > kWellConditioned * plain_terms) return best;
  for (const auto place : o.own) {
    const Complex scale = o.u[s][0][place] * o.d[s][0];
    if (scale == Complex(0)) continue;
    const Node node = o.nodes[place];
    Complex rest = 0;
    double terms = 0;
    for (std::uint32_t t = model_.terminal_start[at(node)]; t < model_.terminal_start[at(node) + 1]; ++t) {
      if (model_.terminals[t].element == o.element) continue;
      for (const auto& slot : solved_.slots(t)) {
        if (!slot.used) continue;
        const Block& block = model_.blocks[slot.block];
        if (block.coupling && s != kZero) continue;
        for (std::uint32_t q = 0; q < block.count; ++q) {
          const std::uint32_t other = model_.block_terminals[block.first + q];
          if (model_.terminals[other].element == o.element)
            return best;  // coupled with it: the rest is not apart
          const Complex term = model_.block_y[block.first_y + slot.position * block.count + q][s] *
                               w(0, model_.terminals[other].node, s);
          rest += term;
          terms += std::abs(term);
        }
      }
    }
    terms /= std::abs(scale);
    if (terms < best_terms) {
      best = rest / scale;
      best_terms = terms;
    }
  }
  return best;
}

// Returns the smallest singular value of the inverse against the terms it is made of.
double OutageWorker::gain(const OutageChange& o, int s, const Columns& w, Eigen::MatrixXcd& g) const {
  const int rank = o.rank[s];
  if (rank == 0) {
    g.resize(0, 0);
    return 1;
  }
  Eigen::MatrixXcd k = -projected(o, s, w);
  double smallest = kInfinite;
  for (int a = 0; a < rank; ++a) {
    const Complex own = o.split ? o.d[s][0] : 1.0 / o.d[s][static_cast<std::size_t>(a)];
    k(a, a) += own;
    smallest = std::min(smallest, std::abs(own));
  }
  if (rank == 1 && !o.split) k(0, 0) = sharper(o, s, w, k(0, 0), smallest);
  const double least =
      rank == 1 ? std::abs(k(0, 0)) : Eigen::JacobiSVD<Eigen::MatrixXcd>(k).singularValues()(rank - 1);
  g = k.inverse();
  return least / smallest;
}

OutageWorker::Response OutageWorker::respond(const OutageChange& o, const Columns& w) {
  Response response;
  // A part without a source may still have an impedance (shunts, transformers in parallel with unequal
  // ratios): the graph is always asked. In zero sequence every such path counts, so that a singular matrix
  // is what tells.
  response.lost[kPositive] = response.lost[kNegative] = lost_.find(o, kPositive);
  for (int s = 0; s < 3; ++s) {
    const double least = gain(o, s, w, response.gain[s]);
    if (least > kSuspectSplit) continue;
    if (s == kZero) response.lost[s] = lost_.find(o, s);
    if (!response.lost[s].any() || (o.rank[s] == 1 && least > kSingular)) continue;
    if (o.rank[s] == 1) {
      response.gain[s].setZero(1, 1);  // nothing flowed through it to what remains
      response.cut[s] = true;
    } else {
      response.unheld[s] = !hold_in_span(o, s, w, response);
    }
  }
  return response;
}

// More than one way through the element: the parts cut off are held by an admittance of their own, so that
// the rest can be computed. Where the columns of U span the place of the hold, e = U t, no further column is
// needed: G = M (1 - U^T W M)^-1 with M = D + size t t^T.
bool OutageWorker::hold_in_span(const OutageChange& o, int s, const Columns& w, Response& response) {
  const auto rows = static_cast<Eigen::Index>(o.nodes.size());
  const auto rank = static_cast<Eigen::Index>(o.rank[s]);
  Eigen::MatrixXcd u(rows, rank), m = Eigen::MatrixXcd::Zero(rank, rank);
  for (Eigen::Index r = 0; r < rank; ++r) {
    for (Eigen::Index p = 0; p < rows; ++p)
      u(p, r) = o.u[s][static_cast<std::size_t>(r)][static_cast<std::size_t>(p)];
    m(r, r) = o.d[s][static_cast<std::size_t>(r)];
  }
  const Eigen::FullPivLU<Eigen::MatrixXcd> solver(u.adjoint() * u);
  for (const Node island : response.lost[s].islands) {
    Eigen::VectorXcd e = Eigen::VectorXcd::Zero(rows);
    e(std::find(o.nodes.begin(), o.nodes.end(), island) - o.nodes.begin()) = 1;
    const Eigen::VectorXcd t = solver.solve(u.adjoint() * e);
    if ((u * t - e).cwiseAbs().maxCoeff() > kInSpan) return false;
    m -= largest_of(o.d[s]) * t * t.transpose();
  }
  const Eigen::MatrixXcd k = projected(o, s, w);
  response.gain[s] = m * (Eigen::MatrixXcd::Identity(rank, rank) - k * m).inverse();
  return true;
}

void OutageWorker::hold_by_columns(const OutageChange& o, int s, Response& response) {
  OutageChange held = o;
  for (const Node island : response.lost[s].islands) {
    held.u[s].emplace_back(o.nodes.size(), 0);
    const auto place = std::find(o.nodes.begin(), o.nodes.end(), island) - o.nodes.begin();
    held.u[s].back()[static_cast<std::size_t>(place)] = 1;
    held.d[s].push_back(-largest_of(o.d[s]));
    ++held.rank[s];
  }
  const auto rank = static_cast<std::size_t>(held.rank[s]);
  held_[s].assign(rank, std::vector<Entry>(model_.node_count()));
  for (std::size_t r = 0; r < rank; ++r) {
    solvers_[0].clear();
    for (std::size_t place = 0; place < o.nodes.size(); ++place) {
      Entry value{};
      value[s] = held.u[s][r][place];
      solvers_[0].put(0, static_cast<sparse::Index>(o.nodes[place]), value);
    }
    solvers_[0].solve();
    solvers_[0].copy(0, held_[s][r]);
  }
  Eigen::MatrixXcd k =
      -projected(held, s, [&](std::size_t r, Node node, int) { return held_[s][r][at(node)][s]; });
  for (std::size_t r = 0; r < rank; ++r)
    k(static_cast<Eigen::Index>(r), static_cast<Eigen::Index>(r)) += 1.0 / held.d[s][r];
  response.gain[s] = k.inverse();
}

// Z' = Z + W G W^T for four outages at a time: each holds one number of every pack.
void OutageWorker::apply(std::span<const Response> responses, bool second_column) {
  FourOutages four{};
  for (std::size_t slot = 0; slot < responses.size(); ++slot)
    for (int s = 0; s < 3; ++s) {
      const auto& g = responses[slot].gain[s];
      const auto set = [&](std::size_t which, Complex value) {
        sparse::set_lane<4>(four.gain[s][which].re, static_cast<int>(slot), value.real());
        sparse::set_lane<4>(four.gain[s][which].im, static_cast<int>(slot), value.imag());
      };
      if (g.size() >= 1) set(0, g(0, 0));
      if (g.size() < 4) continue;
      set(1, g(0, 1) + g(1, 0));
      set(2, g(1, 1));
      four.second[s] = second_column;
    }
  for (int s = 0; s < 3; ++s) four.lane[s] = lane(s);
  four.a = &solvers_[0];
  four.c = &solvers_[1];
  change_loops(four, places_.row, three_phase_, line_to_ground_);
}

void OutageWorker::drop_lost(const OutageChange& o, const Response& response, int number) {
  for (int s = 0; s < 2; ++s) {
    const auto drop = [&](BusIndex bus) {
      const std::size_t place = places_.of_bus[at(bus)];
      if (place == OutagePlaces::kNone) return;
      if (s != kZero) sparse::set_lane<4>(three_phase_[place], number, kInfinite);
      sparse::set_lane<4>(line_to_ground_[place], number, kInfinite);
    };
    for (const Node node : response.lost[s].nodes)
      for (const BusIndex bus : model_.buses_of(node)) drop(bus);
    if (!o.split) continue;
    for (const BusIndex bus : model_.buses_of(o.split->node)) {
      const bool far = std::binary_search(o.split->far_buses.begin(), o.split->far_buses.end(), bus);
      if (far ? response.lost[s].far : response.lost[s].near) drop(bus);
    }
  }
}

// One bus after an outage that goes alone. `far`: the far part of a split node, where 1 - w stands for w.
void OutageWorker::general(const OutageChange& o, const Response& response, std::size_t place, bool far) {
  const OutagePlace& at_place = places_.row[place];
  const std::size_t node = at(at_place.node);
  BySequence<Complex> z = at_place.intact;
  for (int s = 0; s < 3; ++s) {
    const auto& g = response.gain[s];
    const bool by_columns = g.rows() != o.rank[s];
    const auto w = [&](Eigen::Index c) {
      const auto column = static_cast<std::size_t>(c);
      const Complex value = by_columns ? held_[s][column][node][s] : w_[column][node][lane(s)];
      return far && !response.cut[s] ? 1.0 - value : value;
    };
    for (Eigen::Index a = 0; a < g.rows(); ++a)
      for (Eigen::Index b = 0; b < g.cols(); ++b) z[s] += g(a, b) * w(a) * w(b);
  }
  sparse::set_lane<4>(three_phase_[place], 0, std::norm(z[kPositive] + at_place.extra3));
  sparse::set_lane<4>(line_to_ground_[place], 0,
                      std::norm(z[kPositive] + z[kNegative] + z[kZero] + at_place.extra1));
}

}  // namespace kiloamp::detail
