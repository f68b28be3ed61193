#pragma once

namespace stillzone::cli {

/// A zone counts as stagnant when all that flows into it, exchanges included, turns its volume over
/// more slowly than the feed would turn over the whole digester: in more than this many nominal
/// retention times V/Q. Common practice, no source; check and report state it.
inline constexpr double kStagnantTurnovers = 1.0;

}  // namespace stillzone::cli
