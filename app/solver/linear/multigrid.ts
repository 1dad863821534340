import { prepareCompiled } from './compiled'
import type { Kernels } from './kernels'
import { preparePlain } from './plain'
import type { LinearSystem, Prepared } from './system'

/**
 * Makes a system ready for `solve`: conjugate gradients preconditioned by one cycle of operator-dependent multigrid
 * (Alcouffe et al. 1981, SIAM J. Sci. Stat. Comput. 2, 430; Dendy 1982, J. Comput. Phys. 48, 366). Numbers in the
 * system are copied. Nothing is thrown: a system that is not positive definite ends its solves as stalled. With
 * `kernels` a five-point system is solved by compiled arithmetic (compiled.ts), otherwise by its plain twin (plain.ts);
 * compiled arithmetic takes over the memory of `before`, which must not be used any more.
 */
export function prepareMultigrid(system: LinearSystem, kernels?: Kernels, before?: Prepared): Prepared {
  if (kernels && !system.northEast && !system.northWest) return prepareCompiled(system, kernels, before)
  return preparePlain(system)
}
