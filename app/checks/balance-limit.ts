/** Error of the water balance above which a run is no result, percent (common practice, no source). */
export const mostBalanceError = 0.1
