"""The page for chemists and its HTTP interface, served on this machine.

* `app`: the application and its addresses; `decide_routes`: those for decisions;
* `settings`: limits, each with the sentence that is said when it is met;
* `guard`: who may ask and how much, before anything is read;
* `workers`: processes that do the chemistry, each with a time limit;
* `tasks`: what these processes do; `views`, `pictures`, `decide` and `intake` belong to it;
* `streaming`: answers to long lists as they come;
* `exports`: files to take away;
* `schemas`: what is taken and given, as shown by the page of the interface.
"""
