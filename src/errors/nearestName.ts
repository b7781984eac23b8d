/**
 * The name among `known` that a person most likely meant by `name`, or undefined when none is near: at most a
 * third of the letters may differ, one of a short name (Damerau-Levenshtein distance with adjacent exchanges,
 * case ignored).
 */
export function nearestName(name: string, known: Iterable<string>): string | undefined {
  let best: string | undefined;
  let bestDistance = Infinity;
  const wanted = name.toLowerCase().slice(0, 64);
  for (const candidate of known) {
    const distance = editDistance(wanted, candidate.toLowerCase());
    const longer = Math.max(wanted.length, candidate.length);
    const allowed = longer < 2 ? 0 : Math.max(1, Math.floor(longer / 3));
    if (distance <= allowed && distance < bestDistance) {
      best = candidate;
      bestDistance = distance;
    }
  }
  return best;
}

function editDistance(a: string, b: string): number {
  let beforePrevious: number[] = [];
  let previous = Array.from({ length: b.length + 1 }, (_, j) => j);
  for (let i = 1; i <= a.length; i++) {
    const current = [i];
    for (let j = 1; j <= b.length; j++) {
      const substitution = previous[j - 1]! + (a[i - 1] === b[j - 1] ? 0 : 1);
      let distance = Math.min(substitution, previous[j]! + 1, current[j - 1]! + 1);
      if (i > 1 && j > 1 && a[i - 1] === b[j - 2] && a[i - 2] === b[j - 1]) {
        distance = Math.min(distance, beforePrevious[j - 2]! + 1);
      }
      current.push(distance);
    }
    beforePrevious = previous;
    previous = current;
  }
  return previous[b.length]!;
}
