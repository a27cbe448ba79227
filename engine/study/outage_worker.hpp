// The loops of every bus after one outage at a time, one thread's worth.
#pragma once
#include <Eigen/Core>
#include <span>

#include "engine/study/outage_change.hpp"
#include "engine/study/study.hpp"

namespace kiloamp::detail {

/// A bus as the inner loop wants it: what it needs stands together, in the order of the solution in memory.
struct OutagePlace {
  BusIndex bus;
  Node node;
  sparse::Index position;      ///< of the node's solutions in memory
  BySequence<Complex> intact;  ///< Z_kk in pu
  Complex extra3, extra1;      ///< fault impedances in the three-phase and in the line-to-ground loop, in pu
};

/// The study's wanted buses in service, and where each stands.
struct OutagePlaces {
  explicit OutagePlaces(const Study& study);
  std::vector<OutagePlace> row;
  std::vector<std::uint32_t> of_bus;  ///< into row; kNone for a bus that is not wanted or out of service
  static constexpr std::uint32_t kNone = UINT32_MAX;
};

/// Up to four outages solved side by side: |Z|^2 of the loop of each fault at every place, one outage in each
/// of the four numbers; infinite where there is no current.
struct OutageBatch {
  std::span<const std::size_t> which;  ///< outage in number 0, 1, ...
  std::span<const sparse::FourDoubles> three_phase, line_to_ground;
  std::array<const BySequence<LostParts::Lost>*, 4> lost{};
};

/// One thread's work on outages. Four outages of at most two columns are solved and applied side by side;
/// what an outage gives does not depend on its neighbours.
class OutageWorker {
 public:
  OutageWorker(const Study& study, const OutagePlaces& places);

  using Visit = std::function<void(const OutageBatch&)>;
  /// Every outage is in one batch, in no fixed order.
  void run(std::span<const OutageChange> outages, const Visit& visit);

 private:
  using Factors = sparse::Factorisation<Complex, 3>;
  using Solver = Factors::SparseSolver;
  using Entry = Factors::Entry;
  static constexpr std::size_t kSide = 4;     // outages side by side
  static constexpr std::size_t kColumns = 2;  // that an outage among them may have

  /// What the small matrices of one outage say.
  struct Response {
    BySequence<Eigen::MatrixXcd> gain;  ///< (D^-1 - U^T W)^-1
    BySequence<LostParts::Lost> lost;
    BySequence<bool> cut{};     ///< of rank 1 and singular: the rest keeps its Z
    BySequence<bool> unheld{};  ///< a part cut off, and no combination of U holds it
  };
  /// W = Z U at the nodes that the outage knows; column r of sequence s.
  using Columns = std::function<Complex(std::size_t r, Node node, int s)>;

  void side_by_side(std::span<const OutageChange> outages, std::span<const std::size_t> which,
                    const Visit& visit);
  void alone(const OutageChange& outage, std::size_t k, const Visit& visit);
  void put(Solver& solver, int slot, const OutageChange& outage, std::size_t r) const;
  /// The lane of the solutions that holds a sequence.
  [[nodiscard]] std::size_t lane(int s) const {
    return static_cast<std::size_t>(s == kNegative && solved_.negative_is_positive() ? kPositive : s);
  }
  Response respond(const OutageChange& outage, const Columns& w);
  Complex sharper(const OutageChange& outage, int s, const Columns& w, Complex plain,
                  double plain_terms) const;
  double gain(const OutageChange& outage, int s, const Columns& w, Eigen::MatrixXcd& g) const;
  static bool hold_in_span(const OutageChange& outage, int s, const Columns& w, Response& response);
  void hold_by_columns(const OutageChange& outage, int s, Response& response);
  void move_number(int from, int to);
  void apply(std::span<const Response> responses, bool second_column);
  void drop_lost(const OutageChange& outage, const Response& response, int number);
  void general(const OutageChange& outage, const Response& response, std::size_t place, bool far);

  const SequenceModel& model_;
  const FaultNetwork& solved_;
  const OutagePlaces& places_;
  std::array<Solver, kColumns> solvers_;
  LostParts lost_;
  std::vector<sparse::FourDoubles> three_phase_, line_to_ground_;  ///< by place
  std::vector<std::vector<Entry>> w_;                              ///< of an outage that goes alone
  BySequence<std::vector<std::vector<Entry>>> held_;
};

}  // namespace kiloamp::detail
