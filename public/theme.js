// Runs before the first paint, so that a dark room is not lit up by a white page.
;(function () {
  var choice = null
  try {
    choice = JSON.parse(localStorage.getItem('evenstrung.theme'))
  } catch {
    // Nothing kept, or nothing that can be read: follow the system.
  }
  if (choice !== 'light' && choice !== 'dark') {
    choice = matchMedia('(prefers-color-scheme: dark)').matches ? 'dark' : 'light'
  }
  document.documentElement.dataset.theme = choice
})()
