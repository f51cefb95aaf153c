// Runs before the first paint, so that a dark room is not lit up by a white page.
;(function () {
  var choice = null
  try {
    choice = localStorage.getItem('evenstrung.theme')
  } catch {
    // A browser that keeps nothing follows the system.
  }
  if (choice !== 'light' && choice !== 'dark') {
    choice = matchMedia('(prefers-color-scheme: dark)').matches ? 'dark' : 'light'
  }
  document.documentElement.dataset.theme = choice
})()
