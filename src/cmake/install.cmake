# Installation comes here.
