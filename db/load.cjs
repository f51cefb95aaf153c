// Apart from run.cjs, because an old Node.js cannot even read an import() in a file.
'use strict'

import('./command.js').then((command) => command.main(process.argv.slice(2)))
