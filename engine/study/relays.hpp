// What each relay location measures for the faults that decide its settings.
#pragma once
#include "engine/protection/measurement.hpp"
#include "engine/study/study.hpp"

namespace kiloamp {

/// A relay at a bus that looks into a branch; ratios are primary over secondary, empty when not given.
struct RelayLocation {
  std::optional<ElementRef> relay;  ///< empty: a branch terminal without a relay of the case
  BusIndex bus{};
  ElementRef branch;
  std::optional<double> ct_ratio, vt_ratio;
};

enum class RelayFaultPlace : std::uint8_t {
  close_in,    ///< just beyond the relay, on its branch
  remote_bus,  ///< a bus at another end of the branch, and so the other side of a transformer
  line_end,    ///< at the far end of the line, the breaker there open
  further_bus  ///< a bus beyond the remote bus
};
[[nodiscard]] const char* place_name(RelayFaultPlace place);

enum class RelayStateKind : std::uint8_t {
  intact,
  out,                    ///< an element at the relay's bus or at a remote bus
  strongest_source_out,   ///< the source that feeds most of a three-phase fault at the relay's bus
  parallel_line_earthed,  ///< a coupled line out and earthed at both ends
  min_sources,            ///< smallest currents: feeders at min, hot conductors, motors out
  scenario
};
struct RelayState {
  RelayStateKind kind = RelayStateKind::intact;
  std::optional<ElementRef> element;
  std::optional<std::size_t> scenario;
};
/// "intact", "T1 out", "L2 out and earthed", "sources at minimum", a scenario's id.
[[nodiscard]] std::string state_name(const Network& network, const RelayState& state);

/// One location, fault and state; a state that parts the fault from the relay leaves it without current.
/// Angles: the prefault phase-a voltage of the faulted place is at 0 degrees. Currents flow from the bus into
/// the branch.
struct RelayRow {
  std::size_t location = 0;  ///< into the list
  RelayFaultPlace place = RelayFaultPlace::close_in;
  BusIndex place_bus{};  ///< the bus at or before which the fault lies
  FaultKind kind = FaultKind::three_phase;
  RelayState state;
  BySequence<Complex> fault_ka{};
  RelayQuantities primary;
  Complex prefault_kv = 0;  ///< of the relay's bus, line to neutral: the memory of a polarising voltage
  LoopImpedances loops;     ///< primary ohm, k0 of the location's line (0 for other branches)
  std::optional<Direction> direction;
  /// Largest phase current at the fault over that at the relay; empty: no current at the relay.
  std::optional<double> infeed_factor;
  /// 3 I0 at the relay over that at the fault; empty: no earth current.
  std::optional<double> earth_share;
};

struct RelayOptions {
  StudyOptions study;       ///< buses and kinds apply; case kind max
  bool everywhere = false;  ///< every branch terminal instead of the relays of the case
  int further = 1;          ///< buses up to so many branches beyond a remote bus
};

/// Relays of the case on a branch in service, or every terminal of lines, transformers and reactors in
/// service.
struct RelayLocations {
  std::vector<RelayLocation> list;
  std::vector<std::string> left_out;  ///< relays that see nothing, and why
};
[[nodiscard]] RelayLocations relay_locations(const Network& network, bool everywhere);

/// k0 of the line at a location; 0 for other branches.
[[nodiscard]] Complex residual_compensation_of(const Study& study, ElementRef branch);

/// Every location's rows, location by location, in the order: state, place, kind. Local outages change a
/// small matrix of the location's surroundings and solve nothing anew (LocalNetwork); the weak case and
/// scenarios are networks of their own. Memory does not grow with the number of rows.
/// @throws NetworkError, sparse::NumericalError  as Study
class RelayStudy {
 public:
  RelayStudy(const Network& network, const RelayOptions& options);
  ~RelayStudy();

  [[nodiscard]] const Study& intact() const;
  [[nodiscard]] const RelayLocations& locations() const;
  /// All rows of one location; independent of other calls, one Workspace per thread.
  class Workspace;
  [[nodiscard]] std::shared_ptr<Workspace> make_workspace() const;
  void at_location(std::size_t location, Workspace& workspace, std::vector<RelayRow>& rows) const;

 private:
  struct Body;
  std::unique_ptr<Body> body_;
};

}  // namespace kiloamp
