/** Said wherever an answer is shown: a notice of every answer, the foot of every figure. */
export const PLANNING_ESTIMATE =
  'A planning estimate. The collaboration’s own analysis of its detector takes precedence.';

export const PLANNING_NOTICE = { code: 'planning-estimate', detail: PLANNING_ESTIMATE };
