/** Pure edits of a design: each gives a new design and leaves the old one alone. */

/** @template T @param {T[]} list @param {number} index @param {T} item @returns {T[]} */
export const replacedAt = (list, index, item) => list.map((old, i) => (i === index ? item : old));

/** @template T @param {T[]} list @param {number} index @returns {T[]} */
export const removedAt = (list, index) => list.filter((_, i) => i !== index);

/** @template T @param {T[]} list @param {number} index @param {T} item @returns {T[]} */
export const insertedAt = (list, index, item) => [...list.slice(0, index), item, ...list.slice(index)];

/** @template T @param {T[]} list @param {number} from @param {number} to @returns {T[]} */
export function moved(list, from, to) {
  return insertedAt(removedAt(list, from), to, list[from]);
}

/** @param {object} design @param {(list: object[]) => object[]} change */
export const withRequirements = (design, change) => ({ ...design, requirements: change(design.requirements ?? []) });

/** @param {object} design @param {(list: object[]) => object[]} change */
export const withCases = (design, change) => ({ ...design, plant_cases: change(design.plant_cases) });

/** @param {object} design @param {(list: object[]) => object[]} change */
export const withStages = (design, change) => ({
  ...design,
  compensator: { ...design.compensator, stages: change(design.compensator.stages ?? []) },
});

/** @param {object} design @param {number} gain */
export const withGain = (design, gain) => ({ ...design, compensator: { ...design.compensator, gain } });

/** The object with `name` set, or left out when the value is undefined. */
export function withField(object, name, value) {
  const { [name]: _old, ...rest } = object;
  return value === undefined ? rest : { ...rest, [name]: value };
}

/**
 * A case got another name: requirements that name it follow.
 *
 * @param {object} design @param {string} from @param {string|null} to null when the case went away
 */
export function caseRenamed(design, from, to) {
  return withRequirements(design, (list) => list.map((requirement) => {
    if (!requirement.cases?.includes(from)) return requirement;
    const cases = requirement.cases.map((name) => (name === from ? to : name)).filter((name) => name !== null);
    return withField(requirement, "cases", cases.length > 0 ? cases : undefined);
  }));
}

/** A name like `stem` that none of `taken` has. */
export function freeName(stem, taken) {
  if (!taken.includes(stem)) return stem;
  for (let n = 2; ; n += 1) if (!taken.includes(`${stem} ${n}`)) return `${stem} ${n}`;
}
