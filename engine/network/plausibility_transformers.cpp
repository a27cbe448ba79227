#include <cmath>

#include "engine/network/judge.hpp"

namespace kiloamp::detail {

namespace {

template <typename Data>
void judge_resistances(Findings& out, ElementRef ref, const std::string& prefix, const Data& d) {
  if (d.r_percent && *d.r_percent > d.z_percent)
    out.error(ref, prefix + "r_percent",
              number_text(*d.r_percent) + " with z_percent " + number_text(d.z_percent),
              "the resistance must not exceed the impedance", "check the two values");
  if (d.load_loss_kw && d.rated_mva > 0 && *d.load_loss_kw / 10 / d.rated_mva > d.z_percent)
    out.error(ref, prefix + "load_loss_kw",
              number_text(*d.load_loss_kw) + " kW on " + number_text(d.rated_mva) + " MVA with z_percent " +
                  number_text(d.z_percent),
              "the resistance that follows must not exceed the impedance", "check the unit: kW, MVA");
  if (d.r0_percent && *d.r0_percent > d.z0_percent.value_or(d.z_percent))
    out.error(
        ref, prefix + "r0_percent",
        number_text(*d.r0_percent) + " with z0_percent " + number_text(d.z0_percent.value_or(d.z_percent)),
        "the resistance must not exceed the impedance", "check the two values");
}

void judge_tap(Findings& out, ElementRef ref, const std::optional<Tap>& tap, bool has_mv) {
  if (!tap) return;
  if (tap->side == Side::mv && !has_mv)
    out.error(ref, "tap.side", "\"mv\"", "a two-winding transformer has hv and lv", "name the tapped side");
  if (std::abs(tap->position_percent) > 50)
    out.error(ref, "tap.position_percent", number_text(tap->position_percent), "must be within -50 and 50",
              "give the deviation from rated turns, in percent");
}

// True when the group was read and has as many lower windings as it should.
bool group_fits(Findings& out, ElementRef ref, const VectorGroup& group, std::size_t lower) {
  if (group.lower.size() == lower) return true;
  out.error(
      ref, "vector_group", '"' + group.text + '"',
      lower == 1
          ? "must be a vector group of IEC 60076-1 for two windings: D, Y, YN, Z, ZN; d, y, yn, z, zn; a "
            "clock number that exists for them"
          : "must be a vector group of IEC 60076-1 for three windings, a clock number behind each lower one",
      lower == 1 ? "for example Dyn11; star against delta or zigzag has odd numbers, the others even ones"
                 : "for example YNyn0d5");
  return false;
}

void judge_two_winding(Findings& out, ElementRef ref, const Transformer& t) {
  judge_rated_voltage(out, ref, "hv_kv", t.hv_kv, t.hv_bus);
  judge_rated_voltage(out, ref, "lv_kv", t.lv_kv, t.lv_bus);
  if (t.hv_kv < t.lv_kv)
    out.error(ref, "hv_kv, lv_kv", number_text(t.hv_kv) + " and " + number_text(t.lv_kv),
              "hv is the higher voltage", "exchange hv and lv, buses and neutrals with them");
  if (t.hv_bus == t.lv_bus)
    out.error(ref, "hv_bus, lv_bus", "both are \"" + out.network().bus(t.hv_bus).id + '"',
              "must join two different buses", "correct one of them");
  judge_resistances(out, ref, "", t);
  judge_tap(out, ref, t.tap, false);
  if (!group_fits(out, ref, t.vector_group, 1)) return;
  judge_winding(out, ref, "hv_neutral", t.hv_neutral, t.vector_group.hv,
                "the high-voltage winding of " + t.vector_group.text);
  judge_winding(out, ref, "lv_neutral", t.lv_neutral, t.vector_group.lower[0].winding,
                "the low-voltage winding of " + t.vector_group.text);
  if (t.vector_group.auto_symbol)
    out.error(ref, "vector_group", '"' + t.vector_group.text + '"',
              "an autotransformer stands in three_winding_transformers",
              "move it there; its tertiary may be left without a bus");
}

bool is_zigzag(Winding w) { return w == Winding::zigzag || w == Winding::zigzag_neutral; }

void judge_three_winding(Findings& out, ElementRef ref, const ThreeWindingTransformer& t) {
  judge_rated_voltage(out, ref, "hv_kv", t.hv_kv, t.hv_bus);
  judge_rated_voltage(out, ref, "mv_kv", t.mv_kv, t.mv_bus);
  if (t.lv_bus) judge_rated_voltage(out, ref, "lv_kv", t.lv_kv, *t.lv_bus);
  if (t.hv_kv < t.mv_kv)
    out.error(ref, "hv_kv, mv_kv", number_text(t.hv_kv) + " and " + number_text(t.mv_kv),
              "hv is the highest voltage", "exchange the windings");
  if (t.hv_bus == t.mv_bus || t.lv_bus == t.hv_bus || t.lv_bus == t.mv_bus)
    out.error(ref, "hv_bus, mv_bus, lv_bus", "one bus stands twice", "must join different buses",
              "correct one of them");
  judge_resistances(out, ref, "hv_mv.", t.hv_mv);
  judge_resistances(out, ref, "hv_lv.", t.hv_lv);
  judge_resistances(out, ref, "mv_lv.", t.mv_lv);
  judge_tap(out, ref, t.tap, true);
  if (!group_fits(out, ref, t.vector_group, 2)) return;
  const VectorGroup& group = t.vector_group;
  if (is_zigzag(group.hv) || is_zigzag(group.lower[0].winding) || is_zigzag(group.lower[1].winding)) {
    out.error(ref, "vector_group", '"' + group.text + '"', "three windings may be D, Y or YN",
              "describe a zigzag winding as a two-winding or earthing transformer");
    return;
  }
  judge_winding(out, ref, "hv_neutral", t.hv_neutral, group.hv, "the high-voltage winding of " + group.text);
  judge_winding(out, ref, "lv_neutral", t.lv_neutral, group.lower[1].winding,
                "the low-voltage winding of " + group.text);
  if (!t.is_auto()) {
    judge_winding(out, ref, "mv_neutral", t.mv_neutral, group.lower[0].winding,
                  "the medium-voltage winding of " + group.text);
    if (group.auto_symbol)
      out.error(ref, "vector_group", '"' + group.text + "\" without auto",
                "an a in the group and \"auto\": true go together", "add \"auto\": true, or write yn");
    return;
  }
  const bool common = group.hv == Winding::star_neutral && group.lower[0].winding == Winding::star_neutral &&
                      group.lower[0].clock == 0;
  if (!common)
    out.error(ref, "vector_group", '"' + group.text + "\" with auto",
              "an autotransformer is YNa0 or YNyn0 between hv and mv",
              "correct the group, or leave auto out");
  if (t.mv_neutral)
    out.error(ref, "mv_neutral", "given with auto", "hv and mv of an autotransformer share one neutral",
              "give it as hv_neutral alone");
  if (has_neutral(group.lower[1].winding))
    out.error(ref, "vector_group", '"' + group.text + "\" with auto",
              "the tertiary of an autotransformer is d or y", "correct the group");
}

}  // namespace

void judge_transformers(Findings& out) {
  const Network& n = out.network();
  for (std::uint32_t i = 0; i < n.transformers.size(); ++i)
    if (out.judges({ElementKind::transformer, i}))
      judge_two_winding(out, {ElementKind::transformer, i}, n.transformers[i]);
  for (std::uint32_t i = 0; i < n.three_winding_transformers.size(); ++i)
    if (out.judges({ElementKind::three_winding_transformer, i}))
      judge_three_winding(out, {ElementKind::three_winding_transformer, i}, n.three_winding_transformers[i]);
  for (std::uint32_t i = 0; i < n.earthing_transformers.size(); ++i)
    judge_winding(out, {ElementKind::earthing_transformer, i}, "neutral", n.earthing_transformers[i].neutral,
                  Winding::star_neutral, "");
  for (std::uint32_t i = 0; i < n.power_station_units.size(); ++i) {
    if (!out.judges({ElementKind::power_station_unit, i})) continue;
    const PowerStationUnit& u = n.power_station_units[i];
    const SynchronousMachine& m = n.synchronous_machines[u.machine];
    const Transformer& t = n.transformers[u.transformer];
    if (m.bus != t.lv_bus)
      out.error({ElementKind::power_station_unit, i}, "machine, transformer",
                "machine \"" + m.id + "\" at \"" + n.bus(m.bus).id + "\", transformer \"" + t.id +
                    "\" at \"" + n.bus(t.lv_bus).id + '"',
                "the machine must stand at the transformer's lv_bus", "correct the pair");
  }
}

}  // namespace kiloamp::detail
