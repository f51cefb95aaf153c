// Entry of every command. Only syntax that the oldest Node.js still reads, so that it can say what is wrong.
'use strict'

var smallest = [20, 19]

function refusal(version) {
  var parts = String(version).split('.')
  var major = Number(parts[0])
  var minor = Number(parts[1])
  if (major > smallest[0] || (major === smallest[0] && minor >= smallest[1])) return ''
  return (
    'Evenstrung needs Node.js ' +
    smallest.join('.') +
    ' or newer, this is ' +
    version +
    ': install Node.js 20 and run the same command again.'
  )
}

var message = refusal(process.versions.node)
if (message) {
  process.stderr.write(message + '\n')
  process.exit(1)
} else {
  require('./load.cjs')
}
