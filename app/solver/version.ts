/** The engine's version: printed with every result, raised whenever any computed number may change. */
export const engineVersion = '0.2.0'
