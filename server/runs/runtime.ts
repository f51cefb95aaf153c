/** What computed a run, stored beside its method: on the same one, recomputing gives the same bits. */
export const RUNTIME = `node ${process.versions.node}, v8 ${process.versions.v8}, ${process.arch}`
