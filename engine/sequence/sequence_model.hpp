// The three sequence networks of a network in per unit: nodes, blocks of admittances, islands and phase
// shifts.
#pragma once
#include <span>
#include <stdexcept>
#include <vector>

#include "engine/network/finding.hpp"
#include "engine/network/state.hpp"
#include "engine/sequence/circuit.hpp"

namespace kiloamp {

/// Row of the sequence networks: buses that closed switches join share one. Never a BusIndex.
enum class Node : std::int32_t { none = -1 };
[[nodiscard]] constexpr std::size_t at(Node node) { return static_cast<std::size_t>(node); }

/// What stands between the winding at a terminal and earth.
enum class NeutralPath : std::uint8_t {
  none,   ///< no star point, or an open one
  own,    ///< the winding's own star point
  shared  ///< one star point for hv and mv of an autotransformer
};

/// Where an element meets a bus.
struct Terminal {
  ElementRef element;
  BusIndex bus;
  Node node;
  NeutralPath neutral = NeutralPath::none;
};

/// A closed switch: its two buses are one node.
struct MergedSwitch {
  ElementRef element;
  BusIndex from, to;
};

/// An element's own part of the admittance matrices: `count` terminals from `first`, and their y in rows,
/// count x count per sequence. Blocks of coupled lines hold zero sequence only; the lines' own blocks hold
/// the rest.
struct Block {
  std::uint32_t first;  ///< into SequenceModel::block_terminals
  std::uint32_t count;
  std::uint32_t first_y;       ///< into SequenceModel::block_y
  BySequence<bool> earthed{};  ///< the element has a path to earth of its own in that sequence
  bool coupling = false;       ///< the block of a group of coupled lines
};

/// A line that is out of service and earthed at both ends: the current that coupled lines induce in it, from
/// its `from` end to its `to` end, is the sum over `ends` of y times the zero-sequence voltage there.
struct InducedLine {
  ElementRef element;
  BusIndex from;
  std::vector<std::uint32_t> ends;  ///< terminals of the lines in service it is coupled with
  std::vector<Complex> y;           ///< per unit of `from`'s voltage and of each end's
};

struct SequenceOptions {
  /// Keep line charging and shunt banks in positive and negative sequence too. Without it they count in zero
  /// sequence only, as IEC 60909-0 assumes (5.2, from memory).
  bool include_shunts = false;
  /// Also make block_parts: the networks of reactances and of resistances.
  bool separate_parts = false;
};

/// Admittances [pu] of the networks that hold the reactances, or the resistances, of every element alone.
/// Negative sequence is taken as positive, as the standards that use them do.
struct SeparateParts {
  double x1 = 0, x0 = 0;  ///< of 1 / X
  double r1 = 0, r0 = 0;  ///< of 1 / R
};

/// Data that contradict each other in the state under study; the findings say where.
class NetworkError : public std::runtime_error {
 public:
  explicit NetworkError(std::vector<Finding> findings)
      : std::runtime_error("the network contradicts itself"), findings_(std::move(findings)) {}
  [[nodiscard]] const std::vector<Finding>& findings() const { return findings_; }

 private:
  std::vector<Finding> findings_;
};

/// Nodal model, I = Y V per sequence in per unit of base_mva and each bus's nominal voltage.
struct SequenceModel {
  double base_mva = 100;

  // Buses and nodes
  std::vector<Node> node_of_bus;        ///< none: the bus is out of service
  std::vector<double> nominal_kv;       ///< per bus
  std::vector<std::uint8_t> lag_clock;  ///< per bus: how many times 30 degrees it lags its island's reference
  std::vector<std::uint32_t> bus_start;  ///< buses of node n: node_buses[bus_start[n] .. bus_start[n + 1])
  std::vector<BusIndex> node_buses;
  std::vector<MergedSwitch> closed_switches;

  // Admittances
  std::vector<Terminal> terminals;  ///< sorted by node, then by element
  std::vector<std::uint32_t>
      terminal_start;  ///< terminals of node n: [terminal_start[n], terminal_start[n + 1])
  std::vector<Block> blocks;
  std::vector<std::uint32_t> block_terminals;  ///< indices into terminals
  std::vector<BySequence<Complex>> block_y;    ///< per unit
  std::vector<SeparateParts> block_parts;      ///< beside block_y when the options ask for them

  std::vector<InducedLine> induced_lines;

  // Islands
  std::vector<bool> has_source;     ///< per node: a source drives a positive-sequence current here
  std::vector<bool> has_zero_path;  ///< per node: zero-sequence current finds a way to earth and back
  /// Per node: the zero-sequence island it belongs to, and its no-current voltage there (pu, up to a factor
  /// common to the island). Where there is no path to earth a fault to earth shifts the whole island's
  /// potential in this proportion.
  std::vector<Node> zero_island;
  std::vector<double> zero_ratio;
  /// Nodes whose potential is fixed at 0 in a sequence because their island has no path to earth in it: one
  /// per such island, and no net current flows there. The rest of the island keeps its equations.
  BySequence<std::vector<Node>> pinned;

  [[nodiscard]] std::size_t node_count() const { return bus_start.empty() ? 0 : bus_start.size() - 1; }
  [[nodiscard]] std::span<const BusIndex> buses_of(Node n) const {
    return {node_buses.data() + bus_start[at(n)], node_buses.data() + bus_start[at(n) + 1]};
  }
  /// 1 pu of impedance in ohm, and of current in kA, at a bus.
  [[nodiscard]] double base_ohm(BusIndex bus) const {
    return nominal_kv[at(bus)] * nominal_kv[at(bus)] / base_mva;
  }
  [[nodiscard]] double base_ka(BusIndex bus) const;
};

/// Builds the model of the state that `network` is in (after fill_defaults, apply_scenario, apply_case_kind).
///
/// Closed switches merge buses exactly. Lines coupled with each other form one block: y = z^-1 of the lines'
/// zero-sequence impedance matrix, mutual terms (r0m + j x0m) length_km, negative for orientation -1; a line
/// that is out and earthed at both ends stays in z and leaves the terminals. Charging is halved to the ends.
///
/// @throws NetworkError  a loop whose vector groups do not add up to a multiple of 360 degrees (the loop's
/// elements are named), or an
///         earth-fault level from which no zero-sequence impedance follows.
/// Source: Grainger & Stevenson, Power System Analysis, 1994, ch. 7 (nodal admittances), 11 and 12 (sequence
/// networks), from memory.
[[nodiscard]] SequenceModel build_sequence_model(const Network& network, const SequenceOptions& options = {});

}  // namespace kiloamp
