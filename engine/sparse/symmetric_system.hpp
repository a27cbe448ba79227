// Symmetric sparse systems on one pattern: several matrices side by side ("lanes"), their inverses' entries.
//
// Everything a study needs comes in through this header: Analysis (pattern), Values, Factorisation (columns,
// entries and pattern of the inverse, general solutions) and the changes of low rank.
#pragma once
#include "engine/sparse/analysis.hpp"
#include "engine/sparse/factorisation.hpp"
#include "engine/sparse/large_entries.hpp"
#include "engine/sparse/low_rank_change.hpp"
#include "engine/sparse/pattern.hpp"
